package kernel

import (
	"context"

	"brinkline/kernel/wire"
)

// interruptReply ends the running cell and aborts those that wait; the cells
// themselves tell how they ended.
func (k *kernel) interruptReply(context.Context, *wire.Message) content {
	k.shell.interrupt()
	return content{"status": "ok"}
}

// shutdown ends the kernel once the request is answered.
func (k *kernel) shutdown(_ context.Context, m *wire.Message) content {
	var r struct{ Restart bool }
	if bad := read(m, &r); bad != nil {
		return bad
	}
	reply := content{"status": "ok", "restart": r.Restart}
	k.publish(m, "shutdown_reply", reply)
	k.stop()
	return reply
}
