package tape

import (
	"fmt"
	"strconv"
	"strings"
)

// Names are what a formula calls the inputs of a tape.
type Names struct{ States, Params []string }

// Formula writes equation i, or its derivative with respect to state or
// parameter by, as Go: assignments to t1, t2, ... for what is used more than
// once, and the result as the last line. by is the name of a state or parameter,
// or empty for the equation itself.
//
//	t1 := math.Exp(Y)
//	-1 - Da*t1
func (p *Program) Formula(i int, by string, names Names) (string, error) {
	if i < 0 || i >= p.n {
		return "", fmt.Errorf("no equation %d; the model has %d", i, p.n)
	}
	p.mu.Lock()
	defer p.mu.Unlock()
	w := &formula{g: p.g, names: names, hidden: p.hidden, uses: map[int32]int{}, known: map[int32]string{}}
	id := p.out[i]
	if by != "" {
		number, ok := w.variable(by)
		if !ok {
			return "", fmt.Errorf("no state or parameter %q", by)
		}
		d := &deriver{g: p.g}
		id = none
		for _, e := range d.rows(p.out[i:i+1], number)[0] {
			id = e.id
		}
	}
	if id == none {
		return "0", nil
	}
	w.count(id)
	last := w.write(id, 0)
	return strings.Join(append(w.lines, last), "\n"), nil
}

type formula struct {
	g      *graph
	names  Names
	hidden []hidden
	uses   map[int32]int
	known  map[int32]string // what is written already
	lines  []string
}

// variable returns a numbering that knows only the variable of that name.
func (w *formula) variable(name string) (func(node) int32, bool) {
	for op, list := range map[Op][]string{opState: w.names.States, opParam: w.names.Params} {
		for k, n := range list {
			if n == name {
				return func(n node) int32 {
					if n.op == op && int(n.a) == k {
						return 0
					}
					return -1
				}, true
			}
		}
	}
	return nil, false
}

func (w *formula) count(id int32) {
	w.uses[id]++
	if w.uses[id] > 1 {
		return
	}
	n := w.g.nodes[id]
	ids, count := n.operands()
	for _, k := range ids[:count] {
		w.count(k)
	}
}

// Precedences of Go; what binds more tightly is greater.
const (
	loosest  = 0
	compares = 3
	sums     = 4
	products = 5
	tightest = 7
)

// write returns the text of a node, in parentheses where it binds less tightly
// than around.
func (w *formula) write(id int32, around int) string {
	n := w.g.nodes[id]
	if n.op.leaf() {
		return w.leaf(n, around)
	}
	if text, ok := w.known[id]; ok {
		return text
	}
	text, binds := w.operation(n)
	if w.uses[id] > 1 && around != loosest {
		name := fmt.Sprint("t", len(w.known)+1)
		w.lines = append(w.lines, name+" := "+text)
		w.known[id] = name
		return name
	}
	if binds < around {
		return "(" + text + ")"
	}
	return text
}

func (w *formula) leaf(n node, around int) string {
	name := func(list []string, kind string) string {
		if int(n.a) < len(list) {
			return list[n.a]
		}
		return fmt.Sprintf("%s[%d]", kind, n.a)
	}
	switch n.op {
	case opState:
		return name(w.names.States, "u")
	case opParam:
		return name(w.names.Params, "p")
	case opHidden:
		return w.hidden[n.a].name
	}
	text := strconv.FormatFloat(n.value(), 'g', -1, 64)
	switch text {
	case "NaN":
		return "math.NaN()"
	case "+Inf":
		return "math.Inf(1)"
	case "-Inf":
		return "math.Inf(-1)"
	}
	if text[0] == '-' && around > sums {
		return "(" + text + ")"
	}
	return text
}

// operation writes a node and says how tightly it binds.
func (w *formula) operation(n node) (text string, binds int) {
	name := kinds[n.op].name
	infix := func(left, right int) string { return w.write(n.a, left) + name + w.write(n.b, right) }
	switch n.op {
	case opAdd:
		if m := w.g.nodes[n.b]; m.op == opNeg {
			return w.write(n.a, sums) + " - " + w.write(m.a, sums+1), sums
		}
		if m := w.g.nodes[n.a]; m.op == opNeg {
			return w.write(n.b, sums) + " - " + w.write(m.a, sums+1), sums
		}
		name = " + "
		return infix(sums, sums+1), sums
	case opSub:
		name = " - "
		return infix(sums, sums+1), sums
	case opMul, opDiv:
		return infix(products, products+1), products
	case opMulSkip:
		name = "*"
		return infix(products, products+1), products
	case opNeg:
		return "-" + w.write(n.a, products+1), sums
	case opLess, opLessEq, opEqual:
		name = " " + name + " "
		return infix(sums, sums), compares
	case opAnd, opOr:
		name = " " + name + " "
		return infix(compares, compares), 1
	case opNot:
		return "!" + w.write(n.a, tightest), tightest
	case opSelect:
		return fmt.Sprintf("choose(%s, %s, %s)", w.write(n.a, 1), w.write(n.b, 1), w.write(n.c, 1)), tightest
	}
	var args []string
	if kinds[n.op].immediate {
		args = append(args, strconv.Itoa(int(n.c)))
	}
	ids, count := n.operands()
	for _, k := range ids[:count] {
		args = append(args, w.write(k, 1))
	}
	return name + "(" + strings.Join(args, ", ") + ")", tightest
}
