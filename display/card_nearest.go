package display

import (
	"fmt"
	"math"

	"brinkline/continuation"
)

// nearestCard shows the limit that lies nearest in many parameters, and how hard it was
// looked for.
func nearestCard(n *continuation.NearestLimit) *Grid {
	g := newCard(fmt.Sprintf("Nearest limit of %s: %s", n.From.Model().Name(), n.Kind), "now", "at the limit", "change", "scale", "share")
	g.say("distance", significant(n.Distance, stateDigits)+", in scales or standard deviations of the parameters")
	g.heading("parameters, by their share of the squared distance")
	ranked := n.Ranked()
	bound := false
	for i, c := range ranked {
		if g.skip(i, len(ranked)) {
			continue
		}
		at := significant(c.AtLimit, 8)
		if c.Bound {
			at, bound = at+" (bound)", true
		}
		g.add(c.Label(), significant(c.Value, 8), at, significant(c.By, stateDigits), significant(c.Scale, vectorDigits), percentText(c.Share))
	}
	if len(n.Others) > 0 {
		g.heading("further places at which the limit is locally nearest")
		for _, o := range n.Others {
			g.say(o.Kind, "at distance "+significant(o.Distance, stateDigits))
		}
	}
	if bound {
		g.note("Bound: the parameter was not allowed to go further.")
	}
	g.note("Tried: " + n.Tried.String() + ". That is an effort, and no proof.")
	for _, text := range n.Notes {
		g.note(sentenceCase(text))
	}
	g.note(caution)
	return g
}

func percentText(share float64) string {
	if math.IsNaN(share) {
		return ""
	}
	return significant(100*share, 3) + " %"
}

// chanceCard shows how probable it is that a limit is passed, by all methods that were
// used, and which parameters it comes from.
func chanceCard(c *continuation.Chance) *Grid {
	g := newCard(fmt.Sprintf("Probability that %s passes a limit (%s)", c.From.Model().Name(), c.Nearest.Kind), "median", "at the limit", "factor", "share")
	g.say("reliability index", "β = "+significant(c.Index, stateDigits))
	g.say("first order", "Φ(-β) = "+significant(c.First, vectorDigits))
	if !math.IsNaN(c.SecondImproved) {
		g.say("second order", fmt.Sprintf("%s with the curvature of the surface (asymptotic formula: %s)", significant(c.SecondImproved, vectorDigits), significant(c.Second, vectorDigits)))
	}
	if !math.IsNaN(c.Sampled) {
		g.say("sampled", fmt.Sprintf("%s, standard error %s", significant(c.Sampled, vectorDigits), significant(c.Error, 2)))
	}
	g.heading("parameters and where the limit is most likely passed")
	for i, one := range c.Importance {
		if !g.skip(i, len(c.Importance)) {
			g.add(one.Label(), significant(one.Value, 8), significant(one.AtLimit, 8), significant(one.Factor, vectorDigits), percentText(one.Share))
		}
	}
	g.note("Factor: component of the unit vector to the nearest limit in independent standard normal variables; share: its square. Second order after Hohenbichler & Rackwitz (1988), the asymptotic formula after Breitung (1984).")
	if !math.IsNaN(c.Sampled) {
		g.note("Directional sampling: " + c.Sampling.String() + ".")
	}
	for _, text := range c.Notes {
		g.note(sentenceCase(text))
	}
	g.note(caution)
	return g
}

// secondOrderTable shows how a limit moves to second order, and where the first order
// serves.
func secondOrderTable(s *continuation.SecondOrder) *Grid {
	q := s.Limit.Parameter()
	g := &Grid{
		caption: fmt.Sprintf("How the %s moves with the other parameters, to second order", briefly(s.Limit)),
		columns: []column{{"parameter", false}, {"now", true}, {"shift of " + q.Name + " per unit", true}, {"second derivative", true}, {"first order serves from", true}, {"to", true}},
	}
	for _, one := range s.List {
		g.add(one.Label(), significant(one.Value, stateDigits), significant(one.Slope, vectorDigits), significant(one.Second, vectorDigits),
			reachText(one.Low, one.LowOpen, "below "), reachText(one.High, one.HighOpen, "beyond "))
	}
	g.note(fmt.Sprintf("dλ*/dp and d²λ*/dp² with λ = %s; the first order serves where the limit moves within 5 %% of what it says.", q.Name))
	return g
}

// reachText writes the end of an interval, which may lie further than it was looked for.
func reachText(v float64, open bool, further string) string {
	switch {
	case math.IsNaN(v):
		return ""
	case open:
		return further + significant(v, vectorDigits)
	}
	return significant(v, vectorDigits)
}
