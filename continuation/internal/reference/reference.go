// Package reference offers the cases of testdata/reference-cases.json as compiled
// models with their starts and the facts that are known of them. The README in
// testdata names the published source of each.
package reference

//go:generate go run generate.go

import (
	"encoding/json"
	"fmt"
	"os"
	"reflect"
	"strconv"

	"brinkline/continuation"
)

type compiled struct {
	model  any
	params any // zero value
}

// A Number stands in the file as a decimal string.
type Number float64

// UnmarshalJSON reads the string.
func (n *Number) UnmarshalJSON(b []byte) error {
	var text string
	if err := json.Unmarshal(b, &text); err != nil {
		return err
	}
	v, err := strconv.ParseFloat(text, 64)
	*n = Number(v)
	return err
}

// A Case is a model with a start, a range and facts.
type Case struct {
	ID        string            `json:"id"`
	Source    string            `json:"source"`
	Setting   string            `json:"setting"`
	Params    map[string]Number `json:"params"`
	N         int               `json:"n"`
	Scale     []Number          `json:"scale"`
	Equations string            `json:"equations"`
	Follow    struct {
		Param    string `json:"param"`
		From, To Number
	} `json:"follow"`
	Start struct {
		At    map[string]Number
		State json.RawMessage
	} `json:"start"`
	Facts  []Fact `json:"facts"`
	Branch struct {
		SpecialPoints []int          `json:"special_points"`
		Counts        map[string]int `json:"counts"`
		Segments      []struct {
			From, To Number
			Unstable int
		} `json:"segments"`
		Ends []string `json:"ends"`
	} `json:"branch"`
	Digits map[string]int `json:"digits"`
}

// A Fact is what is known of one point.
type Fact struct {
	Kind          string            `json:"kind"`
	At            map[string]Number `json:"at"`
	Params        map[string]Number `json:"params"`
	State         json.RawMessage   `json:"state"`
	NullRight     []Number          `json:"null_right"`
	NullLeft      []Number          `json:"null_left"`
	RangeTest     json.RawMessage   `json:"range_test"`
	Quadratic     Number            `json:"quadratic"`
	Mixed         Number            `json:"mixed"`
	ParamQuad     Number            `json:"parameter_quadratic"`
	Cubic         Number            `json:"cubic"`
	Tangents      [][]Number        `json:"tangents"`
	A2            Number            `json:"a2"`
	B2            Number            `json:"b2"`
	Omega         Number            `json:"omega"`
	Lyapunov      Number            `json:"lyapunov"`
	CrossingSpeed Number            `json:"crossing_speed"`
	Sensitivities map[string]Number `json:"sensitivities"`
	Unstable      *int              `json:"unstable"`
	Role          string            `json:"role"`
}

// Load reads the cases from the file.
func Load(path string) ([]Case, error) {
	text, err := os.ReadFile(path)
	if err != nil {
		return nil, err
	}
	var file struct{ Cases []Case }
	if err := json.Unmarshal(text, &file); err != nil {
		return nil, err
	}
	return file.Cases, nil
}

// Model builds the model of the case at its start. With scales, the typical sizes
// of the states are given to a model on slices.
func (c *Case) Model(scales bool, opts ...continuation.Option) (*continuation.Model, error) {
	known, ok := models[c.ID]
	if !ok {
		return nil, fmt.Errorf("no compiled model for %s; run go generate", c.ID)
	}
	params := reflect.New(reflect.TypeOf(known.params)).Elem()
	for name, v := range c.Params {
		params.FieldByName(name).SetFloat(float64(v))
	}
	for name, v := range c.Start.At {
		params.FieldByName(name).SetFloat(float64(v))
	}
	opts = append([]continuation.Option{continuation.Named(c.ID)}, opts...)
	if c.Setting == "balance" {
		opts = append(opts, continuation.Balance())
	}
	model := known.model
	if reflect.TypeOf(model).NumIn() == 3 {
		opts = append(opts, c.states(scales))
	}
	return continuation.NewModel(model, params.Interface(), opts...)
}

func (c *Case) states(scales bool) continuation.Option {
	names, sizes := make([]string, c.N), []float64(nil)
	for i := range names {
		names[i] = fmt.Sprintf("u[%d]", i)
		if scales {
			sizes = append(sizes, float64(c.Scale[i]))
		}
	}
	return continuation.States(names, nil, sizes)
}

// Values returns a state of the file as a list, in the order of the model.
func Values(raw json.RawMessage, m *continuation.Model) ([]float64, error) {
	var list []Number
	if json.Unmarshal(raw, &list) != nil {
		var named map[string]Number
		if err := json.Unmarshal(raw, &named); err != nil {
			return nil, err
		}
		for _, v := range m.States() {
			list = append(list, named[v.Name])
		}
	}
	out := make([]float64, len(list))
	for i, v := range list {
		out[i] = float64(v)
	}
	return out, nil
}

// Rescaled builds the model of the case with state i in units smaller by
// factors[i]: its numbers are larger by that. Parameters keep their values and are
// named P[0], P[1], ... in the order of the model. With scales, the typical sizes of
// the states are given to it.
func (c *Case) Rescaled(factors []float64, scales bool) (*continuation.Model, error) {
	base, err := c.Model(false)
	if err != nil {
		return nil, err
	}
	names, sizes := make([]string, c.N), []float64(nil)
	for i, v := range base.States() {
		names[i] = v.Name
		if scales {
			sizes = append(sizes, float64(c.Scale[i])*factors[i])
		}
	}
	type params struct{ P []float64 }
	q := params{}
	for _, p := range base.Parameters() {
		q.P = append(q.P, p.Value)
	}
	x := make([]float64, c.N)
	model := func(u []float64, q params, f []float64) {
		for i := range x {
			x[i] = u[i] / factors[i]
		}
		r, err := base.Residual(x, q.P)
		if err != nil {
			panic(err)
		}
		for i := range f {
			f[i] = r[i] * factors[i] // rates are in the new units too
		}
	}
	opts := []continuation.Option{continuation.Named(c.ID), continuation.States(names, nil, sizes)}
	if c.Setting == "balance" {
		opts = append(opts, continuation.Balance())
	}
	return continuation.NewModel(model, q, opts...)
}
