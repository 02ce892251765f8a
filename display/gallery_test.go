package display

import (
	"math"
	"os"
	"path/filepath"
	"testing"

	"brinkline/continuation"
)

// TestGallery draws the pictures that are looked at by eye into the folder that
// BRINKLINE_GALLERY names.
func TestGallery(t *testing.T) {
	dir := os.Getenv("BRINKLINE_GALLERY")
	if dir == "" {
		t.Skip("set BRINKLINE_GALLERY to a folder to draw the pictures there")
	}
	for name, f := range gallery(t) {
		for _, ext := range []string{".svg", ".png"} {
			if err := f.Save(filepath.Join(dir, name+ext)); err != nil {
				t.Errorf("%s: %v", name, err)
			}
		}
		t.Log(name, f)
	}
}

func gallery(t testing.TB) map[string]*Figure {
	start := tankStart(t)
	path := follow(t, start, "Coolant", continuation.Within(280, 320))
	figures := map[string]*Figure{
		"tank":       Plot(path).Y("Temperature"),
		"conversion": Plot(path, Mark(start, "today")),
		"strut":      Plot(strutBranch(t)),
		"lakes":      Plot(lakeBranch(t, 0.7), lakeBranch(t, 0.8), lakeBranch(t, 0.9), lakeBranch(t, 1)),
		"feeder":     Plot(feederBranch(t)).Y("Voltage"),
		"wheel":      Plot(wheelBranch(t)),
		"small":      Plot(tinyBranch(t, 1e-9, 1e6)),
		"folds":      Plot(waveBranch(t)),
		"close":      Plot(closeFolds(t)),
		"closezoom":  Plot(closeFolds(t)).RangeX(0.999999, 1.000002).RangeY(-0.02, 0.02),
		"logs":       Plot(lakeBranch(t, 0.7)).LogY().LogX().RangeX(0.1, 30).RangeY(0.1, 100),
	}
	shown := branchFigure(path)
	figures["branch"] = shown
	loud := branchFigure(lakeBranch(t, 0.7))
	figures["loud"] = loud
	figures["several"] = Plot(lakeBranch(t, 0.7), lakeBranch(t, 1)).Label("lake today", "lake flushed once a year").Title("Phosphorus against load")
	figures["yfunc"] = Plot(path).YFunc("Heat (kW)", func(p *continuation.Point) float64 {
		return 3 * (p.State[1] - p.Parameters[1])
	}).Size(8.5, 6)
	figures["plane"] = Plot(path, path.Folds()).X("Conversion").Y("Temperature")
	figures["crossing"] = Plot(transcritical(t))
	trivial := strutBranch(t)
	bent, err := trivial.BranchPoints()[0].Leave(continuation.Within(0, 20))
	if err != nil {
		t.Fatal(err)
	}
	figures["pitchfork"] = Plot(trivial, bent).Label("straight", "bent")
	locusGallery(t, figures)
	figures["event"] = Plot(hotTank(t)).Y("Temperature")
	figures["isola"] = branchFigure(isola(t))
	figures["points"] = Plot(path.Points(), path.Folds())
	if fold, err := path.LimitAbove(start); err == nil {
		m, err := start.MarginTo(fold)
		if err != nil {
			t.Fatal(err)
		}
		figures["margin"] = Plot(path, m).Y("Temperature")
	} else {
		t.Log(err)
	}
	return figures
}

type oneState struct{ X float64 }
type oneParams struct {
	Push float64 `unit:"N"`
}

// tinyBranch is an S whose state and parameter have the given sizes.
func tinyBranch(t testing.TB, size, scale float64) *continuation.Branch {
	f := func(s oneState, q oneParams) oneState {
		x := s.X / size
		return oneState{q.Push/scale + x - x*x*x}
	}
	m := newModel(t, f, oneParams{Push: -scale}, continuation.Named("switch"))
	return follow(t, settle(t, m, oneState{-1.3 * size}), "Push", continuation.Within(-scale, scale))
}

// waveBranch has many folds one above the other.
func waveBranch(t testing.TB) *continuation.Branch {
	f := func(s oneState, q oneParams) oneState {
		return oneState{q.Push - math.Sin(2*s.X)*2 - 0.15*s.X}
	}
	m := newModel(t, f, oneParams{Push: 0}, continuation.Named("wave"))
	return follow(t, settle(t, m, oneState{0}), "Push", continuation.Within(-4, 4))
}

// closeFolds has two folds whose parameters differ by 1e-6.
func closeFolds(t testing.TB) *continuation.Branch {
	const a = 0.00908560296 // 4/(3 sqrt 3) a^3 = 1e-6 / 2
	f := func(s oneState, q oneParams) oneState {
		return oneState{q.Push - 1 + a*a*s.X - s.X*s.X*s.X}
	}
	m := newModel(t, f, oneParams{Push: 0.5}, continuation.Named("pinch"))
	return follow(t, settle(t, m, oneState{-0.8}), "Push", continuation.Within(0.5, 1.5))
}

// isola is a closed branch: an ellipse.
func isola(t testing.TB) *continuation.Branch {
	f := func(s oneState, q oneParams) oneState {
		return oneState{1 - s.X*s.X - q.Push*q.Push/9}
	}
	m := newModel(t, f, oneParams{Push: 0}, continuation.Named("isola"))
	return follow(t, settle(t, m, oneState{0.8}), "Push", continuation.Within(-5, 5))
}

// transcritical is a population that is harvested: extinction and survival cross.
func transcritical(t testing.TB) []*continuation.Branch {
	f := func(s oneState, q oneParams) oneState { return oneState{s.X * (1 - s.X - q.Push)} }
	m := newModel(t, f, oneParams{Push: 0}, continuation.Named("stock"))
	return []*continuation.Branch{
		follow(t, settle(t, m, oneState{1}), "Push", continuation.Within(0, 2)),
		follow(t, settle(t, m, oneState{0}), "Push", continuation.Within(0, 2)),
	}
}

// hotTank marks where the tank reaches 350 K.
func hotTank(t testing.TB) *continuation.Branch {
	hot := func(p *continuation.Point) float64 { return p.State[1] - 390 }
	return follow(t, tankStart(t), "Coolant", continuation.Within(280, 320), continuation.Mark("too hot", hot))
}

func locusGallery(t testing.TB, figures map[string]*Figure) {
	path, folds, hopfs := tankLoci(t)
	show := func(l *continuation.Locus) *Figure {
		f := Plot(l)
		f.captioned = true
		return f
	}
	figures["locus"] = show(folds)
	figures["locushopf"] = show(hopfs)
	figures["locusplane"] = Plot(path, folds, hopfs).X("Coolant").Y("Inflow")
	figures["locusedge"] = Plot(path, folds).X("Coolant").Y("Inflow")
	start := path.Points()[path.Start()]
	figures["locustoday"] = Plot(folds, Mark(start, "today"))
	figures["locusstate"] = Plot(path, folds).X("Coolant").Y("Temperature")
	if m, err := start.MarginTo(path.Folds()[0]); err == nil {
		figures["locusmargin"] = Plot(folds, m)
	}
	rocker := takens(t, -1)
	within := continuation.Within(-3, 3)
	figures["takens"] = Plot(locus(t, rocker.Folds()[0], "Lever", within), locus(t, rocker.HopfPoints()[0], "Lever", within))
	figures["foldhopf"] = show(foldHopf(t))
	figures["hopfhopf"] = show(hopfHopf(t))
	figures["degenerate"] = show(degenerateLocus(t))
	figures["fansoft"] = Plot(degenerate(t, -1))
	figures["fanhard"] = Plot(degenerate(t, 1)).Y("Y")
	figures["fantakens"] = Plot(rocker)
	motionGallery(t, figures)
	figures["eigentank"] = Eigenvalues(path)
	figures["eigenpoint"] = Eigenvalues(start)
	figures["eigenstrut"] = Eigenvalues(strutBranch(t))
	figures["eigenfeeder"] = Eigenvalues(feederBranch(t))
	figures["eigenfour"] = Eigenvalues(hopfHopf(t).Points()[3])
	figures["eigentakens"] = Eigenvalues(rocker)
}

func motionGallery(t testing.TB, figures map[string]*Figure) {
	m := newModel(t, wheel, wheelParams{Drive: 0.5, Spin: 2}, continuation.Named("wheel"))
	r, err := m.Relax(wheelState{0.1, 0})
	if err != nil {
		t.Fatal(err)
	}
	figures["motion"] = Plot(r)
	figures["motion"].captioned = true
	figures["motionplane"] = Plot(r).X("X").Y("Y")
	slow, err := newModel(t, tank, tankParams{Inflow: 100, Coolant: 300, Feed: 350}, continuation.Named("tank")).Simulate(tankState{0.1, 310}, 8)
	if err != nil {
		t.Fatal(err)
	}
	figures["motiontank"] = Plot(slow).Y("Temperature")
	figures["motiontank"].captioned = true
}
