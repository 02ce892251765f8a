package continuation

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/interp"
	"gonum.org/v1/gonum/stat/distuv"
)

// A Distribution says how a parameter scatters: it is the value T(z) of an increasing
// function of a standard normal variable z, T(z) = F⁻¹(Φ(z)) with the distribution
// function F (Rosenblatt 1952; Nataf 1962).
type Distribution struct {
	Parameter string // name
	Kind      string // "normal", "lognormal", "uniform", "sampled"
	Mean, SD  float64

	low, high float64 // uniform
	mu, sigma float64 // lognormal: of the logarithm
	curve     *sampleCurve
	err       error
}

// Normal says that a parameter is normal with a mean and a standard deviation in its
// own unit.
func Normal(parameter string, mean, sd float64) *Distribution {
	d := &Distribution{Parameter: parameter, Kind: "normal", Mean: mean, SD: sd}
	return d.checked()
}

// Lognormal says that the logarithm of a parameter is normal; mean and standard
// deviation are those of the parameter itself.
func Lognormal(parameter string, mean, sd float64) *Distribution {
	d := &Distribution{Parameter: parameter, Kind: "lognormal", Mean: mean, SD: sd}
	if d.checked().err == nil && !(mean > 0) {
		d.err = fmt.Errorf("the mean of a lognormal %s must be positive, not %g", parameter, mean)
	}
	d.sigma = math.Sqrt(math.Log1p(sd / mean * sd / mean))
	d.mu = math.Log(mean) - d.sigma*d.sigma/2
	return d
}

// Uniform says that a parameter is equally likely everywhere between low and high.
func Uniform(parameter string, low, high float64) *Distribution {
	d := &Distribution{Parameter: parameter, Kind: "uniform", low: low, high: high}
	d.Mean, d.SD = (low+high)/2, (high-low)/math.Sqrt(12)
	if d.checked(); !(low < high) {
		d.err = fmt.Errorf("Uniform(%q, %g, %g) is no interval: the first value must be the smaller", parameter, low, high)
	}
	return d
}

// Sampled says that a parameter is distributed as the values measured: T goes through
// the ordered values at the normal scores Φ⁻¹((i-1/2)/N) (at most 41 of them, equally
// spaced in z), monotone and smooth between (Fritsch & Butland, SIAM Journal on
// Scientific and Statistical Computing 5 (1984) 300-304). Beyond the extremes the tails
// are those of a normal variable that continues the outer tenth of the values: a
// sample says little about its tails.
func Sampled(parameter string, values []float64) *Distribution {
	d := &Distribution{Parameter: parameter, Kind: "sampled"}
	if len(values) < 5 {
		d.err = fmt.Errorf("Sampled(%q) has %d values; at least 5 are needed", parameter, len(values))
		return d
	}
	n := float64(len(values))
	for _, v := range values {
		d.Mean += v / n
	}
	for _, v := range values {
		d.SD += (v - d.Mean) * (v - d.Mean) / (n - 1)
	}
	d.SD = math.Sqrt(d.SD)
	if d.checked().err == nil {
		d.curve, d.err = newSampleCurve(parameter, values)
	}
	return d
}

func (d *Distribution) checked() *Distribution {
	switch {
	case math.IsNaN(d.Mean) || math.IsInf(d.Mean, 0):
		d.err = fmt.Errorf("the mean of %s is %v", d.Parameter, d.Mean)
	case d.SD == 0:
		d.err = fmt.Errorf("the standard deviation of %s is 0: leave it out, it does not scatter", d.Parameter)
	case !(d.SD > 0) || math.IsInf(d.SD, 0):
		d.err = fmt.Errorf("the standard deviation of %s is %g; it must be positive", d.Parameter, d.SD)
	}
	return d
}

// String says the distribution in words.
func (d *Distribution) String() string {
	if d.Kind == "uniform" {
		return fmt.Sprintf("%s uniform from %g to %g", d.Parameter, d.low, d.high)
	}
	return fmt.Sprintf("%s %s, mean %g, standard deviation %g", d.Parameter, d.Kind, d.Mean, d.SD)
}

var standard = distuv.UnitNormal

// at returns T(z) and T'(z).
func (d *Distribution) at(z float64) (value, slope float64) {
	switch d.Kind {
	case "lognormal":
		value = math.Exp(d.mu + d.sigma*z)
		return value, d.sigma * value
	case "uniform":
		return d.low + (d.high-d.low)*standard.CDF(z), (d.high - d.low) * standard.Prob(z)
	case "sampled":
		return d.curve.at(z)
	default:
		return d.Mean + d.SD*z, d.SD
	}
}

// score returns the z with T(z) = value, clamped to the range of T.
func (d *Distribution) score(value float64) float64 {
	low, high := -40.0, 40.0
	for range 200 {
		z := (low + high) / 2
		if v, _ := d.at(z); v < value {
			low = z
		} else {
			high = z
		}
	}
	return (low + high) / 2
}

// A sampleCurve is T of a sample.
type sampleCurve struct {
	fit             interp.FritschButland
	first, last     float64 // normal scores of the extremes
	least, greatest float64
	below, above    float64 // slopes of the tails
}

func newSampleCurve(parameter string, values []float64) (*sampleCurve, error) {
	x := slices.Clone(values)
	slices.Sort(x)
	n := float64(len(x))
	quantile := func(z float64) float64 {
		at := math.Min(math.Max(n*standard.CDF(z)-0.5, 0), n-1)
		i := min(int(at), len(x)-2)
		return x[i] + (at-float64(i))*(x[i+1]-x[i])
	}
	c := &sampleCurve{first: standard.Quantile(0.5 / n), last: standard.Quantile(1 - 0.5/n)}
	knots := min(len(x), 41)
	zs, qs := make([]float64, knots), make([]float64, knots)
	for i := range zs {
		zs[i] = c.first + (c.last-c.first)*float64(i)/float64(knots-1)
		qs[i] = quantile(zs[i])
	}
	c.least, c.greatest = qs[0], qs[knots-1]
	tenth := math.Max(-standard.Quantile(0.1), c.last/4)
	c.below = (quantile(-tenth) - c.least) / (-tenth - c.first)
	c.above = (c.greatest - quantile(tenth)) / (c.last - tenth)
	if !(c.below > 0) || !(c.above > 0) {
		return nil, fmt.Errorf("the outer values of the sample of %s are all the same: it has no tails to continue", parameter)
	}
	return c, c.fit.Fit(zs, qs)
}

func (c *sampleCurve) at(z float64) (value, slope float64) {
	switch {
	case z < c.first:
		return c.least + c.below*(z-c.first), c.below
	case z > c.last:
		return c.greatest + c.above*(z-c.last), c.above
	}
	return c.fit.Predict(z), c.fit.PredictDerivative(z)
}
