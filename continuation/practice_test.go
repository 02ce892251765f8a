package continuation_test

import (
	"math"
	"testing"

	"brinkline/continuation"
)

// A stirred tank in the units of a plant: an invented exothermic first-order
// reaction in a jacketed vessel whose metal follows the contents.
type vesselState struct {
	Concentration float64 `unit:"mol/L"`
	Temperature   float64 `unit:"K"`
}

type vesselParams struct {
	Coolant           float64 `unit:"K"`
	Inflow            float64 `unit:"L/min"`
	FeedTemperature   float64 `unit:"K"`
	FeedConcentration float64 `unit:"mol/L"`
	HeatTransfer      float64 `unit:"kW/K"`
	Volume            float64 `unit:"L"`
	RateAt300K        float64 `unit:"1/h"`
	ActivationEnergy  float64 `unit:"kJ/mol"`
	ReactionHeat      float64 `unit:"kJ/mol"`
	HeatCapacity      float64 `unit:"kJ/(L K)"`
	VesselCapacity    float64 `unit:"kJ/K"`
}

var vesselToday = vesselParams{Coolant: 297, Inflow: 40, FeedTemperature: 298, FeedConcentration: 2.2, HeatTransfer: 0.8, Volume: 1200,
	RateAt300K: 0.12, ActivationEnergy: 79, ReactionHeat: 96, HeatCapacity: 1.8, VesselCapacity: 960}

func (q vesselParams) rate(temp float64) float64 { // 1/min
	return q.RateAt300K / 60 * math.Exp(q.ActivationEnergy/8.314462618e-3*(1.0/300-1/temp))
}

func vessel(s vesselState, q vesselParams) vesselState {
	r := q.rate(s.Temperature) * s.Concentration
	return vesselState{
		Concentration: q.Inflow/q.Volume*(q.FeedConcentration-s.Concentration) - r,
		Temperature: (q.Inflow*q.HeatCapacity*(q.FeedTemperature-s.Temperature) + q.ReactionHeat*r*q.Volume -
			60*q.HeatTransfer*(s.Temperature-q.Coolant)) / (q.Volume*q.HeatCapacity + q.VesselCapacity),
	}
}

// coolant is the curve of steady states in closed form: the coolant temperature
// that holds the vessel at temp.
func (q vesselParams) coolant(temp float64) float64 {
	k := q.rate(temp)
	c := q.FeedConcentration * q.Inflow / (q.Inflow + k*q.Volume)
	released := q.ReactionHeat * k * c * q.Volume
	return temp - (released-q.Inflow*q.HeatCapacity*(temp-q.FeedTemperature))/(60*q.HeatTransfer)
}

// extremum returns the greatest (sign 1) or least (sign -1) value of f between a
// and b by golden section.
func extremum(f func(float64) float64, a, b, sign float64) float64 {
	const golden = 0.6180339887498949
	for range 120 {
		c, d := b-golden*(b-a), a+golden*(b-a)
		if sign*f(c) > sign*f(d) {
			b = d
		} else {
			a = c
		}
	}
	return f((a + b) / 2)
}

// limits follows the vessel from a cold start.
func vesselLimits(t *testing.T, q vesselParams) (start *continuation.Point, ignition, extinction *continuation.Fold) {
	t.Helper()
	m, err := continuation.NewModel(vessel, q)
	if err != nil {
		t.Fatal(err)
	}
	start = settled(t, m, vesselState{q.FeedConcentration, q.FeedTemperature})
	b := mustFollow(t, start, "Coolant", continuation.Within(250, 330))
	if len(b.Specials()) != 2 || len(b.Folds()) != 2 {
		t.Fatalf("found %v, want two folds", b.Specials())
	}
	// The start is known on the branch although the run has polished it.
	ignition, err = b.LimitAbove(start)
	if err != nil {
		t.Fatal(err)
	}
	return start, ignition, b.Folds()[1]
}

func TestVesselAgainstItsClosedForm(t *testing.T) {
	q := vesselToday
	for _, inflow := range []float64{30, 40, 50} {
		q.Inflow = inflow
		start, ignition, extinction := vesselLimits(t, q)
		if v := q.coolant(start.State[1]); math.Abs(v-q.Coolant) > 1e-9 {
			t.Errorf("inflow %g: the start belongs to coolant %.12g", inflow, v)
		}
		for _, c := range []struct {
			fold *continuation.Fold
			sign float64
		}{{ignition, 1}, {extinction, -1}} {
			temp, err := c.fold.At("Temperature")
			if err != nil {
				t.Fatal(err)
			}
			// Golden section is good to the rounding of the closed form.
			if want := extremum(q.coolant, temp-5, temp+5, c.sign); math.Abs(c.fold.Value()-want) > 1e-11*want {
				t.Errorf("inflow %g: fold at %.13g, closed form %.13g", inflow, c.fold.Value(), want)
			}
		}
	}
}

// The sensitivities of a limit are the slopes of the limit in closed form.
func TestVesselSensitivities(t *testing.T) {
	_, ignition, extinction := vesselLimits(t, vesselToday)
	set := map[string]func(*vesselParams) *float64{
		"Inflow":            func(q *vesselParams) *float64 { return &q.Inflow },
		"FeedTemperature":   func(q *vesselParams) *float64 { return &q.FeedTemperature },
		"FeedConcentration": func(q *vesselParams) *float64 { return &q.FeedConcentration },
		"HeatTransfer":      func(q *vesselParams) *float64 { return &q.HeatTransfer },
		"Volume":            func(q *vesselParams) *float64 { return &q.Volume },
		"RateAt300K":        func(q *vesselParams) *float64 { return &q.RateAt300K },
		"ActivationEnergy":  func(q *vesselParams) *float64 { return &q.ActivationEnergy },
		"ReactionHeat":      func(q *vesselParams) *float64 { return &q.ReactionHeat },
		"HeatCapacity":      func(q *vesselParams) *float64 { return &q.HeatCapacity },
		"VesselCapacity":    func(q *vesselParams) *float64 { return &q.VesselCapacity },
	}
	for _, c := range []struct {
		fold *continuation.Fold
		sign float64
	}{{ignition, 1}, {extinction, -1}} {
		s, err := c.fold.Sensitivities()
		if err != nil {
			t.Fatal(err)
		}
		if len(s.List) != len(set) {
			t.Fatalf("%d sensitivities, want %d", len(s.List), len(set))
		}
		temp := c.fold.Where().State[1]
		for _, one := range s.List {
			if one.Name == "VesselCapacity" { // it stands before everything: the limit does not know it
				if one.Slope != 0 {
					t.Errorf("VesselCapacity: %g, want exactly 0", one.Slope)
				}
				continue
			}
			limit := func(change float64) float64 {
				q := vesselToday
				*set[one.Name](&q) *= 1 + change
				return extremum(q.coolant, temp-8, temp+8, c.sign)
			}
			// Central difference of order 4 over steps of 1e-3.
			const h = 1e-3
			want := (8*(limit(h)-limit(-h)) - (limit(2*h) - limit(-2*h))) / (12 * h * one.Value)
			if math.Abs(one.Slope-want) > 1e-7*math.Abs(want) {
				t.Errorf("%s: slope %.10g, by differences of the limit %.10g", one.Name, one.Slope, want)
			}
		}
	}
}
