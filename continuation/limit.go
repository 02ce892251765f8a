package continuation

import (
	"fmt"
	"math"
)

// A Limit is a special point at which the steady state in use is lost or loses its
// stability: a [*Fold], a [*Hopf] point, or a [*BranchPoint] (a structure that buckles
// sideways).
type Limit interface {
	Special
	Value() float64       // of the followed parameter
	Parameter() Parameter // the followed parameter with its value there
	Model() *Model
	// Sensitivities returns how the limit moves with every other parameter.
	Sensitivities() (*Sensitivities, error)
	uncertainty() float64
}

func (f *found) uncertainty() float64 { return f.Uncertainty }

func isNilLimit(l Limit) bool {
	switch l := l.(type) {
	case nil:
		return true
	case *Fold:
		return l == nil
	case *Hopf:
		return l == nil
	case *BranchPoint:
		return l == nil
	}
	return false
}

// Sensitivities returns how the Hopf point moves with every other parameter: dλ*/dp =
// -μ_p/μ_λ with μ the real part of the pair along the branch of steady states,
//
//	μ_p = Re p̄ᵀ (f_xp q - f_xx[q, f_x⁻¹ f_p]),  <p, q> = 1.
func (h *Hopf) Sensitivities() (*Sensitivities, error) {
	at := h.point
	s := newSystem(at.model, at.State, at.Parameters, -1)
	if at.sizes != nil {
		for i, v := range at.sizes.states {
			s.sx[i] = math.Max(s.sx[i], v)
		}
	}
	all := make([]int, len(at.Parameters))
	for j := range all {
		all[j] = j
	}
	mu, _, err := s.hopfSlopes(at.State, at.Parameters, h.Omega, all)
	if err != nil {
		return nil, fmt.Errorf("Sensitivities of the %s: %w", h.Summary(), err)
	}
	// A parameter that moves the real part by no more than the rounding of the
	// eigenvalues does not move it.
	noise := 64 * math.Max(epsilon, accuracy(s.diff)) * spectralSize(at.Eigenvalues)
	slopes := make([]float64, len(mu))
	for j, v := range mu {
		if math.Abs(v*at.Parameters[j]) > noise || at.Parameters[j] == 0 {
			slopes[j] = -v / mu[at.free]
		}
	}
	return sensitivitiesOf(h, slopes)
}

// Sensitivities says why there are none: a change of most parameters breaks the
// crossing into folds. See [BranchPoint.Imperfection].
func (b *BranchPoint) Sensitivities() (*Sensitivities, error) {
	return nil, fmt.Errorf("the %s has no sensitivities: a parameter with an imperfection moves the limit by a power below 1 of its change, without a slope; see Imperfection", b.Summary())
}

// NearestLimitAbove returns the first point at which the steady state in use is lost
// when the parameter grows from p along the branch: a fold, or a Hopf or branch point
// with more eigenvalues of positive real part behind it if that comes first. p is a
// point of the branch. [Branch.LimitAbove] looks for folds alone.
func (b *Branch) NearestLimitAbove(p *Point) (Limit, error) { return b.nearestLimit(p, +1) }

// NearestLimitBelow is [Branch.NearestLimitAbove] for a parameter that falls.
func (b *Branch) NearestLimitBelow(p *Point) (Limit, error) { return b.nearestLimit(p, -1) }

func (b *Branch) nearestLimit(p *Point, sign float64) (Limit, error) {
	at, err := b.locate(p)
	if err != nil {
		return nil, err
	}
	if err := p.inUse(); err != nil {
		return nil, err
	}
	direction, err := b.direction(at, sign)
	if err != nil {
		return nil, err
	}
	for step := 1; step < len(b.points); step++ {
		i := b.wrap(at + direction*step)
		if i < 0 {
			break
		}
		for _, s := range b.specials {
			if l, ok := s.(Limit); ok && s.Index() == i && loses(l, direction) {
				return l, nil
			}
		}
	}
	end := b.ends[0]
	if direction > 0 {
		end = b.ends[1]
	}
	word := map[float64]string{1: "above", -1: "below"}[sign]
	return nil, fmt.Errorf("no limit %s %s on this branch: it %s", word, withUnit(p.Parameters[b.free], b.model.parameters[b.free].Unit), end.Text)
}

// loses reports whether something is lost at a limit that is passed in a direction.
func loses(l Limit, direction int) bool {
	if _, fold := l.(*Fold); fold {
		return true
	}
	before, after := l.around()
	if direction < 0 {
		before, after = after, before
	}
	return after > before || before < 0 || l.Where().model.balance
}

// inUse refuses a steady state that is unstable already.
func (p *Point) inUse() error {
	if p.model.balance || p.Unstable <= 0 {
		return nil
	}
	return fmt.Errorf("the %s is unstable already (%d eigenvalues with positive real part): it has no limit left to lose its stability at", p, p.Unstable)
}

// Margins are how far a steady state is from its limits in one parameter.
type Margins struct {
	From         *Point
	Parameter    Parameter // with its value now
	Below, Above *Margin   // nil where no limit was met; the texts say why
	// BelowText and AboveText say what was met on each side, or how far the steady state
	// was followed without meeting a limit.
	BelowText, AboveText string
	Branch               *Branch // that was followed for it
}

// Margins follows the steady state in a parameter both ways to the first limit on each
// side, whatever it is (a fold, or a Hopf or branch point that comes before it), and
// returns how far these are. The options are those of [Point.Follow]; without [Within]
// the parameter is followed over ten times its size.
func (p *Point) Margins(parameter string, opts ...FollowOption) (*Margins, error) {
	j, err := p.model.parameterIndex(parameter)
	if err != nil {
		return nil, fmt.Errorf("Margins: %w", err)
	}
	if err := p.inUse(); err != nil {
		return nil, fmt.Errorf("Margins: %w", err)
	}
	now := Parameter{p.model.parameters[j].Variable, p.Parameters[j]}
	size := math.Max(math.Abs(now.Value), now.Scale)
	if size == 0 {
		size = 1
	}
	usual := []FollowOption{Within(now.Value-10*size, now.Value+10*size), StopAtSpecial()}
	b, err := p.Follow(parameter, append(usual, opts...)...)
	if err != nil {
		return nil, fmt.Errorf("Margins: %w", err)
	}
	m := &Margins{From: p, Parameter: now, Branch: b}
	start := b.points[b.start]
	for _, side := range []struct {
		sign   float64
		margin **Margin
		text   *string
	}{{-1, &m.Below, &m.BelowText}, {1, &m.Above, &m.AboveText}} {
		limit, err := b.nearestLimit(start, side.sign)
		if err != nil {
			*side.text = err.Error()
			continue
		}
		margin, err := start.MarginTo(limit)
		if err != nil {
			*side.text = err.Error()
			continue
		}
		*side.margin, *side.text = margin, limit.Summary()
	}
	return m, nil
}

// String says both margins in one line.
func (m *Margins) String() string {
	return fmt.Sprintf("margins of %s in %s: below, %s; above, %s", m.From.model.name, m.Parameter.Name, sideText(m.Below, m.BelowText), sideText(m.Above, m.AboveText))
}

func sideText(m *Margin, text string) string {
	if m == nil {
		return text
	}
	return fmt.Sprintf("%s %s", withUnit(m.Absolute, m.Parameter.Unit), text)
}
