package continuation

import "errors"

// WithNotice gives the model something to say under all that is computed from it, as
// long as it returns words: a notebook says there that the definition of the model
// has changed since.
func WithNotice(notice func() string) Option {
	return func(m *Model) error { m.notice = notice; return nil }
}

// Notice returns what is to be said under results of the model, in one line; it is
// empty as long as there is nothing.
func (m *Model) Notice() string {
	if m.notice == nil {
		return ""
	}
	return m.notice()
}

// Unrecorded says why there is no source to take exact derivatives from: the model
// works with finite differences and says so with this reason.
func Unrecorded(reason string) Option {
	return func(m *Model) error {
		m.der = &exact{m: m, refusal: errors.New(reason)}
		return nil
	}
}
