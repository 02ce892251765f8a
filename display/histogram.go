package display

import (
	"fmt"
	"image/color"
	"math"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/plotter"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"brinkline/continuation"
)

// scatterBundle is how the scatter of a margin shows itself: a histogram, with a line where
// the limit is passed.
func scatterBundle(s *continuation.MarginScatter) Bundle {
	p, err := histogram(s)
	if err != nil {
		return plainBundle(s.String())
	}
	return pictureBundle(p)
}

func histogram(s *continuation.MarginScatter) (*picture, error) {
	bins := max(8, min(40, int(math.Sqrt(float64(len(s.Margins))))))
	edges, counts := s.Histogram(bins)
	p := newPlot()
	p.X.Label.Text = "margin in " + s.Parameter.Label()
	p.Y.Label.Text = "samples in a bin"
	p.Y.Min = 0
	for i, n := range counts {
		if n == 0 {
			continue
		}
		box, err := rectangle(edges[i], 0, edges[i+1], float64(n))
		if err != nil {
			return nil, err
		}
		p.Add(box)
	}
	// Where the limit is passed.
	if edges[0] < 0 && edges[len(edges)-1] > 0 {
		line, err := plotter.NewLine(plotter.XYs{{X: 0, Y: 0}, {X: 0, Y: p.Y.Max}})
		if err != nil {
			return nil, err
		}
		line.Color, line.Width = ink, 2*axisWidth
		words, err := plotter.NewLabels(plotter.XYLabels{XYs: plotter.XYs{{X: 0, Y: p.Y.Max}}, Labels: []string{" limit passed where the margin is " + passedSide(s)}})
		if err != nil {
			return nil, err
		}
		words.TextStyle[0] = textStyle(labelSize, ink, draw.XLeft, draw.YBottom)
		p.Y.Max *= 1.08
		p.Add(line, words)
	}
	text := sentenceCase(s.String())
	if s.Missing > 0 {
		text += fmt.Sprintf(" For %s no limit was found.", count(s.Missing, "sample", "samples"))
	}
	return &picture{
		plot: p, width: usualWidth * vg.Centimeter, height: usualHeight * vg.Centimeter,
		title: "Scatter of the margin in " + s.Parameter.Name, description: text, text: text + "\n" + caution,
	}, nil
}

func passedSide(s *continuation.MarginScatter) string {
	if s.Upward {
		return "below 0"
	}
	return "above 0"
}

// rectangle is a box in the colours of the theme.
func rectangle(x0, y0, x1, y1 float64) (plot.Plotter, error) {
	box, err := plotter.NewPolygon(plotter.XYs{{X: x0, Y: y0}, {X: x1, Y: y0}, {X: x1, Y: y1}, {X: x0, Y: y1}})
	if err != nil {
		return nil, err
	}
	box.Color = color.Gray{Y: 205}
	box.LineStyle.Color, box.LineStyle.Width = ink, axisWidth/2
	return box, nil
}

// Bars draws the elasticities of a limit as horizontal bars, the largest on top: by how many
// percent the limit moves for a percent of each parameter.
func Bars(s *continuation.Sensitivities) Bundle {
	if s == nil {
		return plainBundle("there are no sensitivities to draw (nil)")
	}
	p, err := bars(s)
	if err != nil {
		return plainBundle("no bars: " + err.Error())
	}
	return pictureBundle(p)
}

const mostBars = 24

func bars(s *continuation.Sensitivities) (*picture, error) {
	p := newPlot()
	var names []string
	var list []continuation.Sensitivity
	for _, one := range s.Ranked() {
		if len(list) < mostBars && !math.IsNaN(one.Elasticity) && one.Elasticity != 0 {
			list = append(list, one)
		}
	}
	if len(list) == 0 {
		return nil, fmt.Errorf("the limit has no elasticity to any parameter (it is at 0, or nothing moves it)")
	}
	text := fmt.Sprintf("Percent by which the %s moves for a percent of each parameter:", briefly(s.Limit))
	for i := range list {
		one := list[len(list)-1-i]
		box, err := rectangle(0, float64(i)-0.35, one.Elasticity, float64(i)+0.35)
		if err != nil {
			return nil, err
		}
		p.Add(box)
		names = append(names, one.Name)
	}
	for _, one := range list {
		text += fmt.Sprintf(" %s %s;", one.Name, significant(one.Elasticity, 3))
	}
	text = text[:len(text)-1] + "."
	zero, err := plotter.NewLine(plotter.XYs{{X: 0, Y: -0.7}, {X: 0, Y: float64(len(list)) - 0.3}})
	if err != nil {
		return nil, err
	}
	zero.Color, zero.Width = ink, axisWidth
	p.Add(zero)
	p.NominalY(names...)
	p.Y.Width = 0
	p.X.Label.Text = "percent of " + s.Limit.Parameter().Name + " at the " + s.Limit.Kind() + " per percent"
	height := math.Max(usualHeight/2, 1.6+0.55*float64(len(list)))
	return &picture{
		plot: p, width: usualWidth * vg.Centimeter, height: vg.Length(height) * vg.Centimeter,
		title: "Elasticities of the " + briefly(s.Limit), description: text, text: text,
	}, nil
}
