package tape

import (
	"context"
	"fmt"
	"go/ast"
	"go/token"
	"go/types"
	"reflect"
)

const (
	maxNodes  = 2_000_000
	maxWork   = 20_000_000 // steps of the recorder
	maxDepth  = 2000       // calls inside of calls
	maxForks  = 10_000     // conditions that became guards
	maxExits  = 256        // returns under conditions that are pending at once
	wantModel = "the model must be func(State, Params) State or func(u []float64, q Params, f []float64)"
)

// Settings say what a recording starts from.
type Settings struct {
	// States is the number of states of a model on slices.
	States int
	// Params is the value of the parameters: its float64s are symbols, all else
	// in it is taken as it stands.
	Params reflect.Value
	// X and P are the sample point, by which guards choose their side. Nil: all
	// states are 1, and the parameters are those in Params.
	X, P []float64
	// Context gives a recording the context that can end it early; nil: nothing
	// can.
	Context func() context.Context
}

// Record turns a model into a tape. An error is a *[Refusal], or the error of the
// context.
//
// The model is func(State, Params) State with a State of float64s (also arrays
// and nested structs), or func(u []float64, q Params, f []float64). States and
// parameters are numbered in the order in which they are declared.
func Record(src *Source, set Settings) (*Program, error) {
	if src.decls == nil {
		src.declarations()
	}
	ctx := context.Background()
	if set.Context != nil {
		ctx = set.Context()
	}
	guarded := map[token.Pos]bool{}
	for {
		r := newRecorder(src, set, guarded)
		r.ctx = ctx
		p, again, err := r.run()
		if !again {
			return p, err
		}
		if len(guarded) > maxForks {
			return nil, &Refusal{Reason: "the model has too many conditions that cannot be selected"}
		}
	}
}

// A recorder is one pass over a model.
type recorder struct {
	src      *Source
	settings Settings
	ctx      context.Context
	g        *graph
	p        *Program

	guarded map[token.Pos]bool // conditions that are guards
	path    int32              // node of the conditions under which this runs, -1 for none
	inside  []token.Pos        // conditions of which one side is being recorded

	top     *journal
	serials int32
	exits   []exit
	call    *activation
	depth   int
	steps   int

	outer   map[types.Object]*cell
	calling map[ast.Expr]bool // expressions that call functions of the model
}

func newRecorder(src *Source, set Settings, guarded map[token.Pos]bool) *recorder {
	r := &recorder{src: src, settings: set, g: newGraph(), guarded: guarded, path: -1, outer: map[types.Object]*cell{}}
	r.p = &Program{g: r.g, fset: src.Fset, place: src.place}
	r.g.tracing, r.g.limit, r.g.leaf = true, maxNodes, r.sampleOf
	r.g.full = func() { r.inside = nil; r.refuse(nil, "the model takes more than %d operations", maxNodes) }
	return r
}

// run records once. again says that a condition became a guard and that the
// recording must start anew.
func (r *recorder) run() (p *Program, again bool, err error) {
	defer func() {
		switch e := recover().(type) {
		case nil:
		case fork:
			r.guarded[e.pos] = true
			again = true
		case *Refusal:
			err = e
		case stopped:
			err = e.error
		default:
			// A gap in the recorder is no reason to end the program: the model
			// runs without a tape, and says so.
			err = &Refusal{Pos: r.g.at, Place: r.src.place(r.g.at), Reason: fmt.Sprintf("the recorder failed here (%v)", e)}
		}
	}()
	r.model()
	r.finish()
	return r.p, false, nil
}

type stopped struct{ error }

// refuse ends the recording. Inside of one side of a condition it makes that
// condition a guard instead, so that the side may not be needed.
func (r *recorder) refuse(at ast.Node, format string, args ...any) {
	if len(r.inside) > 0 {
		r.mustGuard(r.inside[len(r.inside)-1])
	}
	e := &Refusal{Reason: fmt.Sprintf(format, args...)}
	switch {
	case at != nil:
		e.Pos = at.Pos()
	default:
		e.Pos = r.g.at
	}
	e.Place = r.src.place(e.Pos)
	panic(e)
}

// work counts steps, so that nothing runs without end.
func (r *recorder) work(at ast.Node, n int) {
	before := r.steps
	r.steps += n
	if r.steps > maxWork {
		r.inside = nil
		r.refuse(at, "the model takes too long to record")
	}
	if before>>12 != r.steps>>12 {
		if err := r.ctx.Err(); err != nil {
			panic(stopped{err})
		}
	}
}

func (r *recorder) sampleOf(n node) float64 {
	switch n.op {
	case opState:
		if int(n.a) < len(r.settings.X) {
			return r.settings.X[n.a]
		}
		return 1
	case opParam:
		if int(n.a) < len(r.settings.P) {
			return r.settings.P[n.a]
		}
		return r.p.values[n.a]
	case opHidden:
		return *r.p.hidden[n.a].at
	}
	return 0
}

// model calls the function on symbols.
func (r *recorder) model() {
	f, node := r.function()
	sig := f.sig
	switch {
	case sig.Params().Len() == 2 && sig.Results().Len() == 1 && types.Identical(sig.Params().At(0).Type(), sig.Results().At(0).Type()):
		state := r.symbols(node, sig.Params().At(0).Type(), opState, &r.p.n)
		params := r.params(node, sig.Params().At(1).Type())
		r.flatten(node, r.invoke(node, f, []value{state, params}), &r.p.out)
	case sig.Params().Len() == 3 && sig.Results().Len() == 0 && floats(sig.Params().At(0).Type()) && floats(sig.Params().At(2).Type()):
		r.p.n = r.settings.States
		u, out := r.newGroup(r.p.n), r.newGroup(r.p.n)
		nan := float(r.g.constant(nan))
		for i := range u.cells {
			u.cells[i].v = float(r.g.intern(kindNode(opState, i)))
			out.cells[i].v = nan
		}
		r.invoke(node, f, []value{sliceOf(u), r.params(node, sig.Params().At(1).Type()), sliceOf(out)})
		for i := range out.cells {
			r.p.out = append(r.p.out, out.cells[i].v.id())
		}
	default:
		r.refuse(node, wantModel)
	}
}

func kindNode(op Op, i int) node { return node{op: op, a: int32(i)} }

func floats(t types.Type) bool {
	s, ok := t.Underlying().(*types.Slice)
	return ok && isFloat(s.Elem())
}

func isFloat(t types.Type) bool {
	b, ok := t.Underlying().(*types.Basic)
	return ok && (b.Kind() == types.Float64 || b.Kind() == types.UntypedFloat)
}

func sliceOf(g *group) value {
	return value{kind: kSlice, ref: &slice{base: g, len: len(g.cells), cap: len(g.cells)}}
}

// function returns the model as a function value.
func (r *recorder) function() (*closure, ast.Node) {
	if r.src.Lit != nil {
		sig, _ := r.src.Info.TypeOf(r.src.Lit).(*types.Signature)
		return &closure{lit: r.src.Lit, env: r.outer, sig: sig}, r.src.Lit
	}
	decl := r.src.decls[r.src.Func]
	if decl == nil {
		r.refuse(nil, "the source of the model is not there")
	}
	c := &closure{decl: decl, sig: r.src.Func.Signature()}
	if recv := c.sig.Recv(); recv != nil {
		v := r.receiver(decl, recv.Type())
		c.recv = &v
	}
	return c, decl
}

// symbols returns a value of the type whose floats are symbols.
func (r *recorder) symbols(at ast.Node, t types.Type, op Op, count *int) value {
	switch u := t.Underlying().(type) {
	case *types.Basic:
		if isFloat(u) {
			*count++
			return float(r.g.intern(kindNode(op, *count-1)))
		}
	case *types.Struct:
		g := r.newGroup(u.NumFields())
		for i := range g.cells {
			if u.Field(i).Name() == "_" {
				continue // has no name, so it is no state and no parameter
			}
			g.cells[i].v = r.symbols(at, u.Field(i).Type(), op, count)
		}
		return value{kind: kGroup, ref: g}
	case *types.Array:
		g := r.newGroup(int(u.Len()))
		for i := range g.cells {
			g.cells[i].v = r.symbols(at, u.Elem(), op, count)
		}
		return value{kind: kGroup, ref: g}
	}
	r.refuse(at, "a state of type %s is not a float64", r.typeName(t))
	return value{}
}

// flatten lists the floats of a result in the order of symbols.
func (r *recorder) flatten(at ast.Node, v value, out *[]int32) {
	switch v.kind {
	case kFloat:
		*out = append(*out, v.id())
	case kNone:
	case kGroup:
		for i := range v.ref.(*group).cells {
			r.flatten(at, v.ref.(*group).cells[i].v, out)
		}
	default:
		r.refuse(at, wantModel)
	}
}

// params returns the parameters: floats are symbols, the rest is as it stands in
// the value of the settings.
func (r *recorder) params(at ast.Node, t types.Type) value {
	return r.parameter(at, t, r.settings.Params)
}

func (r *recorder) parameter(at ast.Node, t types.Type, v reflect.Value) value {
	switch u := t.Underlying().(type) {
	case *types.Basic:
		if isFloat(u) {
			start := 0.0
			if v.IsValid() {
				start = v.Float()
			}
			r.p.values = append(r.p.values, start)
			r.p.m++
			return float(r.g.intern(kindNode(opParam, r.p.m-1)))
		}
	case *types.Struct:
		g := r.newGroup(u.NumFields())
		for i := range g.cells {
			if u.Field(i).Name() == "_" {
				continue // has no name, so it is no state and no parameter
			}
			g.cells[i].v = r.parameter(at, u.Field(i).Type(), field(v, i))
		}
		return value{kind: kGroup, ref: g}
	case *types.Array:
		g := r.newGroup(int(u.Len()))
		for i := range g.cells {
			g.cells[i].v = r.parameter(at, u.Elem(), element(v, i))
		}
		return value{kind: kGroup, ref: g}
	case *types.Slice:
		if !v.IsValid() || v.IsNil() {
			return value{kind: kNil}
		}
		g := r.newGroup(v.Len())
		for i := range g.cells {
			g.cells[i].v = r.parameter(at, u.Elem(), element(v, i))
		}
		return sliceOf(g)
	}
	return r.snapshot(t, v)
}

func field(v reflect.Value, i int) reflect.Value {
	if !v.IsValid() {
		return v
	}
	return v.Field(i)
}

func element(v reflect.Value, i int) reflect.Value {
	if !v.IsValid() {
		return v
	}
	return v.Index(i)
}

// finish takes the sample values off and makes a program of the graph.
func (r *recorder) finish() {
	r.p.sample = r.g.sample
	r.p.pos = r.g.pos
	r.g.tracing, r.g.sample, r.g.pos, r.g.loose = false, nil, nil, true
	r.p.base = int32(len(r.g.nodes))
}
