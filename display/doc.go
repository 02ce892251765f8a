// Package display shows the values of package continuation: branches as
// pictures, special points and sensitivities as tables, models, steady states
// and folds as cards. It picks the renderer by the type of the value.
//
// A picture follows the usage of textbooks. A stable stretch is a solid line, an
// unstable one a dashed line of the same ink, and one whose stability was not
// computed a dotted line. A special point is drawn as the local geometry it
// stands for: a fold is a short bar along the tangent with which the curve turns;
// a simple stationary bifurcation is the crossing of the tangents of both
// branches (where the second could not be computed, of the branch's own and of
// the null vector of f_x, the direction in which the steady state stops being
// isolated; where a picture cannot show two directions, of one and its normal); a
// Hopf point is a small ring with a tick; an event of the analyst's own is a tick
// across the curve. The label beside it says the word and the value. At a Hopf point a
// thin fan is the local estimate of the oscillation that is born there, solid where it
// is stable and dashed where it is unstable.
//
// In a plane of two parameters a locus of folds is a solid line and one of Hopf points
// a dash-dotted one, which goes on dotted where it is one of neutral saddles; it is
// thinner where no stable steady state is lost. A cusp is the wedge of its two edges;
// where a fold and a Hopf point meet, the bar of the one and the ring of the other are
// drawn together: the ring rests on the bar at a Bogdanov-Takens point, where the Hopf
// locus begins, and has it for a diameter at a fold-Hopf point. Two rings are a
// Hopf-Hopf point; a ring filled on its hard side is a degenerate Hopf point. Points
// between those computed lie on the parabola through three neighbours.
//
// Of a balance (a model without time) nothing is called stable. Its solid
// stretches are those on which f_x has as many eigenvalues with positive real
// part as at the start of the branch, its dashed ones those with another number,
// and the description of the picture says so.
//
//	display.Show(path, fold)                            // in the order given
//	display.Plot(path, start).Y("Temperature")          // a picture on request
//	display.Plot(path, edge).X("Coolant").Y("Inflow")   // a locus, and the branch in its plane
//	display.Eigenvalues(path)                           // real parts along a branch
//	display.Table(path)                                 // the special points
//	display.Points(path)                                // every point
//
// In an ordinary program Show prints the plain text of its values to standard
// output; WriteSVG, WritePNG and Save put a figure into a file. A notebook shows
// the richest form that its front end understands.
package display
