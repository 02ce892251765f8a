package formula

import (
	"encoding/xml"
	"io"
	"strings"
	"testing"
)

// body returns what is within the formula's outer elements.
func body(t *testing.T, source string, block bool) string {
	t.Helper()
	element, ok := MathML(source, block)
	if !ok {
		t.Errorf("%s is not understood", source)
		return ""
	}
	decoder := xml.NewDecoder(strings.NewReader(element))
	for {
		if _, err := decoder.Token(); err == io.EOF {
			break
		} else if err != nil {
			t.Fatalf("%s becomes %s: %v", source, element, err)
		}
	}
	_, rest, _ := strings.Cut(element, "<semantics><mrow>")
	inner, _, _ := strings.Cut(rest, "</mrow><annotation")
	return inner
}

func TestMathML(t *testing.T) {
	for _, c := range []struct{ source, want string }{
		{`x`, `<mi>x</mi>`},
		{`2.5x - 1`, `<mn>2.5</mn><mi>x</mi><mo>−</mo><mn>1</mn>`},
		{`x_i^2`, `<msubsup><mrow><mi>x</mi></mrow><mrow><mi>i</mi></mrow><mrow><mn>2</mn></mrow></msubsup>`},
		{`f'(x)`, `<msup><mrow><mi>f</mi></mrow><mrow><mo>′</mo></mrow></msup><mo stretchy="false">(</mo><mi>x</mi><mo stretchy="false">)</mo>`},
		{`\frac{a}{b}`, `<mfrac><mrow><mrow><mi>a</mi></mrow></mrow><mrow><mrow><mi>b</mi></mrow></mrow></mfrac>`},
		{`\dot T`, "<mi style=\"font-style:italic\">T\u0307</mi>"},
		{`\hat{\lambda}`, "<mi style=\"font-style:italic\">λ\u0302</mi>"},
		{`\bar{xy}`, `<mover accent="true"><mrow><mrow><mi>x</mi><mi>y</mi></mrow></mrow><mo>¯</mo></mover>`},
		{`\lambda \le 3`, `<mi>λ</mi><mo>≤</mo><mn>3</mn>`},
		{`a < b`, `<mi>a</mi><mo>&lt;</mo><mi>b</mi>`},
		{`\sqrt[3]{x}`, `<mroot><mrow><mrow><mi>x</mi></mrow></mrow><mrow><mn>3</mn></mrow></mroot>`},
		{`\exp x`, "<mi>exp</mi><mo>\u2061</mo><mi>x</mi>"},
		{`k_{\text{cold side}}`, "<msub><mrow><mi>k</mi></mrow><mrow><mrow><mtext>cold\u00a0side</mtext></mrow></mrow></msub>"},
		{`\left[ x \right.`, `<mrow><mo stretchy="true" fence="true">[</mo><mi>x</mi></mrow>`},
		{`T\,\mathrm{K}`, `<mi>T</mi><mspace width="0.17em"></mspace><mi mathvariant="normal">K</mi>`},
		{`\begin{cases} a \\ b \end{cases}`, `<mrow><mo stretchy="true" fence="true">{</mo><mtable displaystyle="true"><mtr><mtd style="text-align:left"><mi>a</mi></mtd></mtr><mtr><mtd style="text-align:left"><mi>b</mi></mtd></mtr></mtable></mrow>`},
	} {
		if got := body(t, c.source, false); got != c.want {
			t.Errorf("%s becomes\n%s\nwant\n%s", c.source, got, c.want)
		}
	}
}

func TestLimitsStandAboveAndBelowInBlocks(t *testing.T) {
	const source = `\sum_{i=1}^n x_i`
	if got := body(t, source, true); !strings.HasPrefix(got, "<munderover>") {
		t.Errorf("block: %s", got)
	}
	if got := body(t, source, false); !strings.HasPrefix(got, "<msubsup>") {
		t.Errorf("inline: %s", got)
	}
}

func TestFormulasOfModels(t *testing.T) {
	for _, source := range []string{
		`\dot x = -\frac{F}{V} x + k_0 e^{-E/(R T)} (1 - x)`,
		`P_i = \sum_{j=1}^{n} |V_i| |V_j| \left( G_{ij} \cos\theta_{ij} + B_{ij} \sin\theta_{ij} \right)`,
		`w^\top f_\lambda \ne 0, \qquad a = \tfrac{1}{2} w^{\top} f_{xx}[v, v]`,
		`\begin{aligned} \dot x &= f(x, \lambda) \\ y &= \int_0^1 g \, ds \end{aligned}`,
		`\begin{pmatrix} f_x & f_\lambda \\ v^\top & 0 \end{pmatrix}`,
		`\lambda - \lambda^* \approx -\frac{a}{w^\top f_\lambda} s^2`,
	} {
		body(t, source, true)
	}
}

func TestUnknownFormulasAreLeftAlone(t *testing.T) {
	for _, source := range []string{
		``, ` `, `\unknown x`, `{a`, `a}`, `x^`, `x_1_2`, `\frac{a}`, `\left( a`, `\left a \right)`, `\begin{x} a \end{x}`, `\begin{cases} a`,
		`\begin{cases} a \end{matrix}`, `a & b`, `a \\ b`, `\text{a`, `\text{$x$}`, `\`, `#`, `\sqrt[3`, `\dot`, `<script>#`,
	} {
		if element, ok := MathML(source, true); ok {
			t.Errorf("%q became %s", source, element)
		}
	}
}

func FuzzMathML(f *testing.F) {
	f.Add(`\frac{a}{b}_1^2 \left( \sqrt[3]{x'} \right] \text{a < b} \begin{cases} a & b \\ c \end{cases}`)
	f.Fuzz(func(t *testing.T, source string) {
		element, ok := MathML(source, true)
		if !ok {
			return
		}
		decoder := xml.NewDecoder(strings.NewReader(strings.ToValidUTF8(strings.Map(printable, element), "")))
		for {
			if _, err := decoder.Token(); err == io.EOF {
				return
			} else if err != nil {
				t.Fatalf("%q becomes %s: %v", source, element, err)
			}
		}
	})
}

func printable(r rune) rune {
	if r < ' ' || r >= 0xfffe && r <= 0xffff {
		return -1
	}
	return r
}
