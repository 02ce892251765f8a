// Package continuation follows the steady states of a model f(x, λ) = 0 as a
// parameter λ changes, round the folds at which they vanish, and says which
// kind of singular point each of them is and how much margin is left.
//
// # Setting
//
// The state x has n components, the parameters p have m, and λ is the one of
// them that is followed. A model is a plain Go function,
//
//	func tank(s State, q Params) State                // structs of float64
//	func rod(u []float64, q Params, f []float64)      // large systems
//
// that returns (or fills) the n values of f. Read as a rate law dx/dt = f(x, p),
// a steady state is stable when every eigenvalue of f_x has a negative real
// part. A model made with [Balance] has no time behind it: nothing is called
// stable then, and the number of eigenvalues with positive real part is
// reported instead.
//
//	plant, err := continuation.NewModel(tank, Params{Inflow: 100, Coolant: 300})
//	start, err := plant.Settle(State{0.5, 350})
//	path, err := start.Follow("Coolant", continuation.Within(280, 320))
//	fold, err := path.LimitAbove(start)
//
// # Scaling
//
// Step length, tolerances and norms are measured in scaled variables. The
// scale of a variable is its `scale` tag where given, else the size that it
// has at the start and along the branch. Reported values are always in the
// user's units; rescaling a state by 1e6 does not change an answer beyond
// rounding.
//
// # Signs and normalisations
//
// At a singular point v and w are the right and left null vectors of f_x:
// f_x v = 0, wᵀ f_x = 0, with |v| = 1 in the user's units, the largest component
// of v positive (of equal ones the first), and wᵀ v = 1.
//
// A run that ends early is not an error but a branch with a reason, see [End].
package continuation
