package continuation

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strconv"
)

// A Margin is how far the parameter can still be pushed from a steady state
// before a limit is met.
type Margin struct {
	From      *Point
	To        Limit
	Parameter Parameter // with its value now
	// Absolute is λ* - λ, in the parameter's unit: negative for a limit below.
	Absolute float64
	// Percent is the margin in percent of |λ|, NaN where λ is 0.
	Percent float64
}

// MarginTo returns how far it is from this steady state to a limit, along the
// parameter in which the limit was found. All other parameters must have the same
// values at both, and the steady states that meet at a fold must lie on this side of
// it.
func (p *Point) MarginTo(limit Limit) (*Margin, error) {
	if isNilLimit(limit) {
		return nil, fmt.Errorf("there is no limit to measure to (nil)")
	}
	at := limit.Where()
	if p.model != at.model {
		return nil, fmt.Errorf("the steady state and the %s belong to different models", limit.Kind())
	}
	j := at.free
	for i, v := range p.Parameters {
		if i != j && v != at.Parameters[i] {
			q := p.model.parameters[i]
			return nil, fmt.Errorf("%s is %s at the steady state and %s at the %s: a margin is along one parameter",
				q.Name, withUnit(v, q.Unit), withUnit(at.Parameters[i], q.Unit), limit.Kind())
		}
	}
	now := p.Parameters[j]
	m := &Margin{From: p, To: limit, Parameter: Parameter{p.model.parameters[j].Variable, now}}
	if err := m.side(); err != nil {
		return nil, err
	}
	m.Absolute = limit.Value() - now
	m.Percent = math.NaN()
	if now != 0 {
		m.Percent = 100 * m.Absolute / math.Abs(now)
	}
	return m, nil
}

// side refuses a fold beyond which the steady state already lies.
func (m *Margin) side() error {
	f, ok := m.To.(*Fold)
	if !ok || f.Greatest() == (m.Parameter.Value <= f.Value()) {
		return nil
	}
	word := "least"
	if f.Greatest() {
		word = "greatest"
	}
	q := m.Parameter
	return fmt.Errorf("the %s is the %s %s of the steady states that meet there, and %s now is beyond it: the steady state in use is none of them; take the limit on its own way (LimitAbove, LimitBelow)",
		f.Summary(), word, q.Name, withUnit(q.Value, q.Unit))
}

// Digits returns how many digits of the margin can be relied on.
func (m *Margin) Digits() int {
	return reliableDigits(m.Absolute, m.To.uncertainty())
}

// String says the margin in one line.
func (m *Margin) String() string {
	text := fmt.Sprintf("margin in %s: %s", m.Parameter.Name, FormatUncertain(m.Absolute, m.To.uncertainty(), 6))
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

// Sensitivities say how a limit moves with every other parameter, to first order.
type Sensitivities struct {
	Limit Limit
	List  []Sensitivity // in the order of the model's parameters
}

// Ranked returns the sensitivities by falling size of the elasticity; where the limit
// is at 0, of value times slope. Those that are equal up to rounding keep the order of
// the model's parameters, and undefined ones come last.
func (s *Sensitivities) Ranked() []Sensitivity {
	list := slices.Clone(s.List)
	slices.SortStableFunc(list, func(a, b Sensitivity) int { return cmp.Compare(b.weight(), a.weight()) })
	return list
}

// weight is what a sensitivity is ranked by, to six digits.
func (s Sensitivity) weight() float64 {
	w := math.Abs(s.Elasticity)
	if math.IsNaN(w) {
		w = math.Abs(s.Value * s.Slope)
	}
	if math.IsNaN(w) {
		return -1
	}
	w, _ = strconv.ParseFloat(strconv.FormatFloat(w, 'e', 5, 64), 64)
	return w
}

// A Sensitivity is that of a limit λ* to another parameter p.
type Sensitivity struct {
	Parameter
	// Slope is dλ*/dp, units of λ per unit of p: -(wᵀ f_p)/(wᵀ f_λ) of a fold, -μ_p/μ_λ
	// of a Hopf point with μ the real part of the pair.
	Slope float64
	// Elasticity is (p/λ*) dλ*/dp: percent of λ* for a percent of p; NaN where λ*
	// is 0.
	Elasticity float64
}

// Sensitivities returns how the fold moves with every other parameter.
func (f *Fold) Sensitivities() (*Sensitivities, error) { return sensitivitiesOf(f, f.sensitivities) }

// sensitivitiesOf makes sensitivities of slopes for all parameters.
func sensitivitiesOf(limit Limit, slopes []float64) (*Sensitivities, error) {
	s := &Sensitivities{Limit: limit}
	at := limit.Where()
	for j, slope := range slopes {
		if j == at.free {
			continue
		}
		q := at.model.parameters[j]
		q.Value = at.Parameters[j]
		e := math.NaN()
		if limit.Value() != 0 {
			e = slope * q.Value / limit.Value()
		}
		s.List = append(s.List, Sensitivity{q, slope, e})
	}
	if len(s.List) == 0 {
		return nil, fmt.Errorf("the model has no parameter besides %s", at.Parameter)
	}
	return s, nil
}
