package kernel

import (
	"context"
	"sync"

	"brinkline/display"
	"brinkline/kernel/wire"
)

// output publishes what a cell shows. It may be used for longer than the cell
// runs: what its goroutines write later still belongs to it.
type output struct {
	ctx    context.Context // done when the cell is interrupted
	k      *kernel
	parent *wire.Message
	number int
	silent bool
	input  bool // the client takes input requests

	mu     sync.Mutex // orders what is published
	stream stream
}

func newOutput(ctx context.Context, k *kernel, m *wire.Message, r executeRequest, number int) *output {
	o := &output{ctx: ctx, k: k, parent: m, number: number, silent: r.Silent, input: orTrue(r.AllowStdin)}
	o.stream.publish = func(name, text string) {
		k.publish(m, "stream", content{"name": name, "text": text})
	}
	o.stream.lock = &o.mu
	return o
}

// Stream publishes text of "stdout" or "stderr", soon.
func (o *output) Stream(name, text string) {
	if o.silent || text == "" {
		return
	}
	o.room()
	o.mu.Lock()
	defer o.mu.Unlock()
	o.stream.write(name, text)
}

// Display publishes a bundle; later updates find it by its id.
func (o *output) Display(b display.Bundle, id string) { o.bundle("display_data", b, id) }

// Update changes all that was displayed under id.
func (o *output) Update(b display.Bundle, id string) { o.bundle("update_display_data", b, id) }

func (o *output) bundle(msgType string, b display.Bundle, id string) {
	transient := content{}
	if id != "" {
		transient["display_id"] = id
	}
	o.publish(msgType, content{"data": object(b.Data), "metadata": object(b.Metadata), "transient": transient})
}

// Clear removes what the cell has shown, at once or with the next output.
func (o *output) Clear(wait bool) { o.publish("clear_output", content{"wait": wait}) }

// publish sends a message after the text that was written before it.
func (o *output) publish(msgType string, c content) {
	if o.silent {
		return
	}
	o.room()
	o.mu.Lock()
	defer o.mu.Unlock()
	o.stream.flush()
	o.k.publish(o.parent, msgType, c)
}

// room holds back output that comes faster than clients read it.
func (o *output) room() { o.k.sockets.Room(o.ctx.Done()) }

// result closes the output with the value of the cell.
func (o *output) result(b *display.Bundle) {
	o.end()
	if b == nil || o.silent {
		return
	}
	o.k.publish(o.parent, "execute_result", content{
		"execution_count": o.number, "data": object(b.Data), "metadata": object(b.Metadata),
	})
}

// fail closes the output with an error, given as the content of the reply.
func (o *output) fail(reply content) {
	o.end()
	if !o.silent {
		o.k.publish(o.parent, "error", content{
			"ename": reply["ename"], "evalue": reply["evalue"], "traceback": reply["traceback"],
		})
	}
}

// end publishes what is left of the text.
func (o *output) end() {
	o.mu.Lock()
	defer o.mu.Unlock()
	o.stream.end()
}
