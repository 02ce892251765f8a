package continuation

import (
	"fmt"

	"brinkline/continuation/tape"
)

// An exactRun differentiates by tapes for one run. Where there is no tape, finite
// differences do it.
type exactRun struct {
	e        *exact
	s        *system
	plain    equations
	fallback Differentiator

	*machines // of the program in use, nil before there is one
	others    map[*tape.Program]*machines
	in        tape.Inputs
	useless   bool // the model was refused for good
}

// machines run one program.
type machines struct {
	program  *tape.Program
	values   *tape.Machine
	jacobian []*tape.Machine // by free parameter + 1
	rare     map[derivative]*tape.Machine
}

// A derivative names one of the machines that are not used at every step.
type derivative struct {
	adjoint, single bool
	free            int
	along           string
}

// ready makes sure that there is a program to try at this point.
func (d *exactRun) ready(x, p []float64) bool {
	if d.useless {
		return false
	}
	if d.machines != nil && d.program.Current() {
		return true
	}
	return d.change(x, p)
}

// change goes over to the program that belongs to this point.
func (d *exactRun) change(x, p []float64) bool {
	q, refused := d.e.at(x, p, d.plain)
	if q == nil {
		d.useless = refused
		return false
	}
	m := d.others[q]
	if m == nil {
		m = &machines{program: q, values: q.Value().NewMachine(), jacobian: make([]*tape.Machine, len(p)+1), rare: map[derivative]*tape.Machine{}}
		if d.others == nil || len(d.others) > 100 {
			d.others = map[*tape.Program]*machines{}
		}
		d.others[q] = m
	}
	d.machines = m
	return true
}

// value stores f; it reports false where there is no tape.
func (d *exactRun) value(x, p, f []float64) bool {
	if !d.ready(x, p) {
		return false
	}
	if !d.values.Run(x, p) && (!d.change(x, p) || !d.values.Run(x, p)) {
		return false
	}
	copy(f, d.values.Out())
	return true
}

func (d *machines) jacobianMachine(j int) *tape.Machine {
	m := d.jacobian[j+1]
	if m == nil {
		m = d.program.Jacobian(j).NewMachine()
		d.jacobian[j+1] = m
	}
	return m
}

// Jacobian stores f_z, row by row.
func (d *exactRun) Jacobian(x, p []float64, j int, jac []float64) error {
	if err := d.s.ctx.Err(); err != nil {
		return ErrInterrupted
	}
	if !d.ready(x, p) || !d.jacobianMachine(j).Run(x, p) && (!d.change(x, p) || !d.jacobianMachine(j).Run(x, p)) {
		return d.fallback.Jacobian(x, p, j, jac)
	}
	copy(jac, d.jacobian[j+1].Out())
	for i, v := range jac {
		if v-v != 0 {
			return d.undefined(x, p, j, i, v, len(jac)/d.s.n)
		}
	}
	return nil
}

func (d *exactRun) undefined(x, p []float64, j, i int, v float64, width int) error {
	variable := ""
	if k := i % width; k < d.s.n {
		variable = d.s.m.states[k].Name
	} else {
		variable = d.s.m.parameters[j].Name
	}
	what := fmt.Sprintf("the derivative of the equation of %s with respect to %s is %v", d.s.m.states[i/width].Name, variable, v)
	if place := d.program.Blame(x, p); place != "" {
		what += " (" + place + ")"
	}
	return &DomainError{What: what, Where: d.s.describe(x, p)}
}

// machine returns the machine of a derivative.
func (d *machines) machine(q derivative) *tape.Machine {
	m := d.rare[q]
	if m == nil {
		switch {
		case q.single:
			m = d.program.Parameter(q.free).NewMachine()
		case q.adjoint:
			m = d.program.Adjoint(q.free, q.along).NewMachine()
		default:
			m = d.program.Directional(q.free, q.along).NewMachine()
		}
		d.rare[q] = m
	}
	return m
}

// evaluate runs a derivative at the inputs of d and stores it in out; it reports
// false where there is no tape.
func (d *exactRun) evaluate(q derivative, x, p, out []float64) (bool, error) {
	if d.s.ctx.Err() != nil {
		return true, ErrInterrupted
	}
	in := d.in
	in.X, in.P = x, p
	if !d.ready(x, p) {
		return false, nil
	}
	m := d.machine(q)
	if !m.RunWith(&in) {
		if !d.change(x, p) {
			return false, nil
		}
		if m = d.machine(q); !m.RunWith(&in) {
			return false, nil
		}
	}
	copy(out, m.Out())
	for _, v := range out {
		if v-v != 0 {
			return true, &DomainError{What: fmt.Sprintf("a derivative of the model is %v", v), Where: d.s.describe(x, p)}
		}
	}
	return true, nil
}

// Accuracy returns the relative error of first derivatives.
func (d *exactRun) Accuracy() float64 {
	if d.machines == nil {
		return accuracy(d.fallback)
	}
	return epsilon
}

// Parameter stores f_{p_j}.
func (d *exactRun) Parameter(x, p []float64, j int, col []float64) error {
	if done, err := d.evaluate(derivative{single: true, free: j}, x, p, col); done {
		return err
	}
	return d.fallback.Parameter(x, p, j, col)
}

// Second stores f_zz[a, a].
func (d *exactRun) Second(x, p []float64, j int, a, out []float64) error {
	d.in.Dirs[0] = a
	if done, err := d.evaluate(derivative{free: j, along: "aa"}, x, p, out); done {
		return err
	}
	return d.fallback.Second(x, p, j, a, out)
}

// Third stores f_zzz[a, a, a].
func (d *exactRun) Third(x, p []float64, j int, a, out []float64) error {
	d.in.Dirs[0] = a
	if done, err := d.evaluate(derivative{free: j, along: "aaa"}, x, p, out); done {
		return err
	}
	if t, ok := d.fallback.(ThirdOrder); ok {
		return t.Third(x, p, j, a, out)
	}
	return &DomainError{What: "there is no third derivative of the model", Where: d.s.describe(x, p)}
}

// Adjoint stores wᵀ f_zz[a, ·].
func (d *exactRun) Adjoint(x, p []float64, j int, w, a, out []float64) error {
	d.in.W, d.in.Dirs[0] = w, a
	if done, err := d.evaluate(derivative{adjoint: true, free: j, along: "a"}, x, p, out); done {
		return err
	}
	return d.fallback.Adjoint(x, p, j, w, a, out)
}
