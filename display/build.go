package display

import (
	"strings"

	"gonum.org/v1/plot/vg"

	"brinkline/continuation"
)

// build makes the picture of the figure.
func (f *Figure) build() (*picture, error) {
	if f.eigen != nil {
		return f.buildEigenvalues()
	}
	s, err := f.scene()
	if err != nil {
		return nil, err
	}
	return f.describe(s, f.sentence(s))
}

// describe lays a scene out and says it in words: the sentence, and the notes under
// the plot.
func (f *Figure) describe(s *scene, sentence string) (*picture, error) {
	notes := f.notes()
	p, err := f.lay(s, f.wrapNotes(notes))
	if err != nil {
		return nil, err
	}
	p.title, p.description = f.heading(s), sentence
	p.text = strings.TrimSpace(p.description + "\n" + strings.Join(notes, "\n"))
	return p, nil
}

// lay puts a scene on axes that fit, over the lines under the plot.
func (f *Figure) lay(s *scene, notes []string) (*picture, error) {
	p := newPlot()
	p.Title.Text = spell(f.title)
	height := f.height - vg.Length(len(notes))*notePitch
	xs, ys := s.values()
	if err := s.x.fit(&p.X, xs, f.width-60, false); err != nil {
		return nil, err
	}
	s.roomForFolds(&p.X, f.width-60)
	if err := s.y.fit(&p.Y, ys, height-45, true); err != nil {
		return nil, err
	}
	p.Add(&drawing{scene: s})
	return &picture{plot: p, width: f.width, height: f.height, notes: notes}, nil
}

// heading is the title for those who do not see the picture.
func (f *Figure) heading(s *scene) string {
	if f.title != "" {
		return f.title
	}
	return s.y.what() + " against " + s.x.what() + " (" + strings.Join(f.modelNames(), ", ") + ")"
}

// notes are the lines under a figure: what the models have to say, and of a branch
// that is shown as it is why it ends and what the run could not explain.
func (f *Figure) notes() []string {
	var notes []string
	if f.noticed = f.notice(); f.noticed != "" {
		notes = strings.Split(f.noticed, "\n")
	}
	if !f.captioned {
		return notes
	}
	notes = append(notes, f.diagramNotes()...)
	for _, b := range f.branches() {
		if f.inDiagram(b) {
			continue
		}
		notes = append(notes, sentenceCase(endsOf(b)))
		for _, n := range b.Notes() {
			notes = append(notes, sentenceCase(n))
		}
	}
	for _, l := range f.loci() {
		notes = append(notes, sentenceCase(endsOfLocus(l)))
		for _, n := range l.Notes() {
			notes = append(notes, sentenceCase(n))
		}
	}
	for _, it := range f.motions() {
		text := it.word
		if text == "" {
			text = it.motion.Ended
		}
		notes = append(notes, sentenceCase(text))
	}
	return notes
}

func (f *Figure) wrapNotes(notes []string) []string {
	var lines []string
	for _, n := range notes {
		lines = append(lines, wrap(spell(n), noteSize, f.width-12)...)
	}
	const most = 8
	if len(lines) > most {
		lines = append(lines[:most-1], "... the rest is in the text of the figure and in the branch's Notes")
	}
	return lines
}

// endsOf says how many points there are and why the branch ends.
func endsOf(b *continuation.Branch) string {
	return endsText("branch", len(b.Points()), b)
}

func endsOfLocus(l *continuation.Locus) string { return endsText("locus", len(l.Points()), l) }

func endsText(what string, points int, curve interface {
	Closed() bool
	Ends() [2]continuation.End
}) string {
	text := count(points, "point", "points") + "; the " + what + " "
	ends := curve.Ends()
	switch {
	case curve.Closed():
		return text + "is a closed curve"
	case ends[0].Text == ends[1].Text:
		return text + ends[0].Text + " (both ends)"
	default:
		return text + ends[0].Text + " and " + ends[1].Text
	}
}

// sentenceCase makes a sentence of a remark.
func sentenceCase(text string) string {
	if text == "" || strings.HasSuffix(text, ".") {
		return capital(text)
	}
	return capital(text) + "."
}
