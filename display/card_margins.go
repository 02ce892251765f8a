package display

import (
	"fmt"
	"math"

	"brinkline/continuation"
)

// marginsCard shows how far a steady state is from its limits in one parameter, below
// and above.
func marginsCard(m *continuation.Margins) *Grid {
	q := m.Parameter
	g := newCard(fmt.Sprintf("Margins of %s in %s", m.From.Model().Name(), q.Name), "limit", "margin", "in percent of the value now")
	g.add(withUnit("now "+significant(q.Value, 8), q.Unit), "", "", "")
	for _, side := range []struct {
		word   string
		margin *continuation.Margin
		text   string
	}{{"above", m.Above, m.AboveText}, {"below", m.Below, m.BelowText}} {
		if side.margin == nil {
			g.say(side.word, side.text)
			continue
		}
		one := side.margin
		digits := max(one.Digits(), 1)
		percent := ""
		if !math.IsNaN(one.Percent) {
			percent = significant(one.Percent, min(4, digits)) + " %"
		}
		g.add(side.word+": "+one.To.Kind(), withUnit(valueText(one.To, 8), q.Unit), withUnit(significant(one.Absolute, min(6, digits)), q.Unit), percent)
	}
	g.note("The other parameters stay as they are.")
	g.note(caution)
	return g
}

// directionCard shows how far several parameters can move together.
func directionCard(m *continuation.DirectionMargin) *Grid {
	heads := []string{"now", "step", "at the limit", "change"}
	if m.Sensitivities != nil {
		heads = append(heads, "steps per unit")
	}
	g := newCard(fmt.Sprintf("Margin of %s along a direction", m.From.Model().Name()), heads...)
	g.say("limit", m.Kind)
	g.say("steps to it", continuation.FormatUncertain(m.Steps, m.Uncertainty, 8))
	g.heading("parameters that move")
	moved := map[string]bool{}
	for _, c := range m.Changes {
		moved[c.Name] = true
		cells := []string{c.Label(), significant(c.Value, 8), significant(c.Step, stateDigits), significant(c.AtLimit, 8), significant(c.By, stateDigits)}
		g.add(append(cells, stepsPerUnit(m, c.Name)...)...)
	}
	g.heldRows(m, moved)
	if m.Sensitivities != nil {
		g.note("Steps per unit: by how much the number of steps changes with today's value of the parameter, to first order.")
	}
	g.note(caution)
	return g
}

// heldRows lists the parameters that stay, whose values move the margin too.
func (g *Grid) heldRows(m *continuation.DirectionMargin, moved map[string]bool) {
	if m.Sensitivities == nil || len(moved) == len(m.From.Parameters) {
		return
	}
	g.heading("parameters that stay")
	for i, q := range m.From.Model().Parameters() {
		if !moved[q.Name] {
			cells := []string{q.Label(), significant(m.From.Parameters[i], 8), "", "", ""}
			g.add(append(cells, stepsPerUnit(m, q.Name)...)...)
		}
	}
}

// stepsPerUnit is the last cell of a parameter's row, none where sensitivities are not
// known.
func stepsPerUnit(m *continuation.DirectionMargin, name string) []string {
	for i, q := range m.From.Model().Parameters() {
		if q.Name == name && i < len(m.Sensitivities) {
			return []string{significant(m.Sensitivities[i], vectorDigits)}
		}
	}
	return nil
}
