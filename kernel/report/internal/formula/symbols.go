package formula

import "strings"

// pairs makes a map of "name symbol" pairs.
func pairs(text string) map[string]string {
	words := strings.Fields(text)
	m := make(map[string]string, len(words)/2)
	for i := 0; i+1 < len(words); i += 2 {
		m[words[i]] = words[i+1]
	}
	return m
}

func names(text string) map[string]bool {
	m := map[string]bool{}
	for _, w := range strings.Fields(text) {
		m[w] = true
	}
	return m
}

var (
	identifiers = pairs(`
		alpha α beta β gamma γ delta δ epsilon ϵ varepsilon ε zeta ζ eta η theta θ vartheta ϑ iota ι kappa κ
		lambda λ mu μ nu ν xi ξ pi π rho ρ sigma σ tau τ upsilon υ phi ϕ varphi φ chi χ psi ψ omega ω
		Gamma Γ Delta Δ Theta Θ Lambda Λ Xi Ξ Pi Π Sigma Σ Upsilon Υ Phi Φ Psi Ψ Omega Ω
		infty ∞ partial ∂ nabla ∇ ell ℓ hbar ℏ Re ℜ Im ℑ emptyset ∅ dots … ldots … cdots ⋯ vdots ⋮ % %`)

	operators = pairs(`
		cdot · times × div ÷ pm ± mp ∓ le ≤ leq ≤ ge ≥ geq ≥ ne ≠ neq ≠ approx ≈ sim ∼ simeq ≃ equiv ≡ propto ∝
		ll ≪ gg ≫ to → rightarrow → leftarrow ← Rightarrow ⇒ Leftrightarrow ⇔ mapsto ↦ in ∈ notin ∉ subset ⊂ cup ∪ cap ∩
		sum ∑ prod ∏ int ∫ oint ∮ mid ∣ circ ∘ star ⋆ ast ∗ forall ∀ exists ∃ top ⊤ perp ⊥ langle ⟨ rangle ⟩
		{ { } } | ‖ colon : prime ′`)

	accents = pairs(`dot ˙ ddot ¨ bar ¯ overline ¯ hat ^ widehat ^ tilde ~ widetilde ~ vec →`)

	combiningMarks = map[string]string{"˙": "\u0307", "¨": "\u0308", "¯": "\u0304", "^": "\u0302", "~": "\u0303"}

	spaces = pairs(`, 0.17em : 0.22em ; 0.28em ! -0.17em quad 1em qquad 2em`)

	functions = names(`sin cos tan sinh cosh tanh arctan arcsin arccos exp ln log lim max min sup inf det rank tr arg`)

	// limits stand above and below these where a formula has room.
	limits = names(`\sum \prod \lim \max \min \sup \inf`)
)

func init() { spaces[" "] = "0.25em" }
