package continuation

import (
	"fmt"
	"math"
)

// A Margin is how far the parameter can still be pushed from a steady state
// before a fold is met.
type Margin struct {
	From      *Point
	To        *Fold
	Parameter Parameter // with its value now
	// Absolute is λ* - λ, in the parameter's unit: negative for a limit below.
	Absolute float64
	// Percent is the margin in percent of |λ|, NaN where λ is 0.
	Percent float64
}

// MarginTo returns how far it is from this steady state to a fold, along the
// parameter in which the fold was found. All other parameters must have the same
// values at both.
func (p *Point) MarginTo(limit *Fold) (*Margin, error) {
	if limit == nil {
		return nil, fmt.Errorf("there is no limit to measure to (nil)")
	}
	if p.model != limit.point.model {
		return nil, fmt.Errorf("the steady state and the fold belong to different models")
	}
	j := limit.point.free
	for i, v := range p.Parameters {
		if i != j && v != limit.point.Parameters[i] {
			q := p.model.parameters[i]
			return nil, fmt.Errorf("%s is %s at the steady state and %s at the fold: a margin is along one parameter",
				q.Name, withUnit(v, q.Unit), withUnit(limit.point.Parameters[i], q.Unit))
		}
	}
	now := p.Parameters[j]
	m := &Margin{From: p, To: limit, Parameter: Parameter{p.model.parameters[j].Variable, now}}
	m.Absolute = limit.Value() - now
	m.Percent = math.NaN()
	if now != 0 {
		m.Percent = 100 * m.Absolute / math.Abs(now)
	}
	return m, nil
}

// Digits returns how many digits of the margin can be relied on.
func (m *Margin) Digits() int {
	return reliableDigits(m.Absolute, m.To.Uncertainty)
}

// String says the margin in one line.
func (m *Margin) String() string {
	text := fmt.Sprintf("margin in %s: %s", m.Parameter.Name, FormatUncertain(m.Absolute, m.To.Uncertainty, 6))
	if m.Parameter.Unit != "" {
		text += " " + m.Parameter.Unit
	}
	if !math.IsNaN(m.Percent) {
		text += fmt.Sprintf(" (%.3g %%)", m.Percent)
	}
	return text
}

// reliableDigits returns how many digits of a value with an error are right.
func reliableDigits(value, uncertainty float64) int {
	if uncertainty <= 0 {
		return 15
	}
	size := math.Abs(value)
	if size == 0 {
		return 0
	}
	return max(0, min(15, int(math.Floor(-math.Log10(2*uncertainty/size)))))
}

// Sensitivities say how a fold moves with every other parameter, to first order.
type Sensitivities struct {
	Fold *Fold
	List []Sensitivity // in the order of the model's parameters
}

// A Sensitivity is that of a limit λ* to another parameter p.
type Sensitivity struct {
	Parameter
	// Slope is dλ*/dp = -(wᵀ f_p)/(wᵀ f_λ), units of λ per unit of p.
	Slope float64
	// Elasticity is (p/λ*) dλ*/dp: percent of λ* for a percent of p; NaN where λ*
	// is 0.
	Elasticity float64
}

// Sensitivities returns how the fold moves with every other parameter.
func (f *Fold) Sensitivities() (*Sensitivities, error) {
	s := &Sensitivities{Fold: f}
	for j, slope := range f.sensitivities {
		if j == f.point.free {
			continue
		}
		q := f.point.model.parameters[j]
		q.Value = f.point.Parameters[j]
		e := math.NaN()
		if f.Value() != 0 {
			e = slope * q.Value / f.Value()
		}
		s.List = append(s.List, Sensitivity{q, slope, e})
	}
	if len(s.List) == 0 {
		return nil, fmt.Errorf("the model has no parameter besides %s", f.point.Parameter)
	}
	return s, nil
}
