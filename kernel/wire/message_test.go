package wire

import (
	"bytes"
	"encoding/hex"
	"encoding/json"
	"math"
	"strconv"
	"strings"
	"testing"
	"unicode/utf8"
)

// TestSignature uses test case 2 of RFC 2202 and RFC 4231: key "Jefe", data
// "what do ya want for nothing?".
func TestSignature(t *testing.T) {
	for scheme, want := range map[string]string{
		"hmac-md5":    "750c783e6ab0b503eaa86e310a5db738",
		"hmac-sha1":   "effcdf6ae5eb2fa2d27416d5f184df9c259a7c79",
		"hmac-sha224": "a30e01098bc6dbbf45690f3a7e9e6d0f8bbea2a39e6148008fd05e44",
		"hmac-sha256": "5bdcc146bf60754e6a042426089575c75a003f089d2739839dec58b964ec3843",
	} {
		s, err := newSigner(scheme, "Jefe")
		if err != nil {
			t.Fatal(err)
		}
		parts := [][]byte{[]byte("what do ya "), []byte("want "), nil, []byte("for nothing?")}
		if got := s.sign(parts); string(got) != want {
			t.Errorf("%s: %s, want %s", scheme, got, want)
		}
		if !s.verify([]byte(want), parts) || s.verify([]byte(want[1:]+"0"), parts) || s.verify(nil, parts) {
			t.Errorf("%s: verify is wrong", scheme)
		}
	}
}

func TestTheOldestSignaturesAreForgotten(t *testing.T) {
	var r replays
	for i := range rememberedSignatures + 10 {
		if !r.add([]byte(strconv.Itoa(i))) {
			t.Fatalf("signature %d was taken for a repeated one", i)
		}
	}
	if r.add([]byte("10")) || r.add([]byte(strconv.Itoa(rememberedSignatures))) {
		t.Error("a remembered signature was let through")
	}
	if !r.add([]byte("9")) || len(r.seen) != rememberedSignatures {
		t.Errorf("signature 9 is still remembered among %d", len(r.seen))
	}
}

func TestMarshal(t *testing.T) {
	type named struct{ A any }
	for _, x := range []struct {
		v    any
		want string
	}{
		{map[string]any{"x": math.NaN(), "y": []float64{1, math.Inf(-1)}, "z": "<&>"}, `{"x":null,"y":[1,null],"z":"<&>"}`},
		{map[string]any{"p": map[string]float64{"q": math.Inf(1)}, "n": nil, "f": []any{float32(2.5), nil}, "j": math.NaN()},
			`{"f":[2.5,null],"j":null,"n":null,"p":{"q":null}}`},
		{map[string]any{"raw": json.RawMessage(`{"a":1}`), "nan": math.NaN()}, `{"nan":null,"raw":{"a":1}}`},
		{map[string]any{"a": [2]float64{math.NaN(), 3}, "s": named{1}}, `{"a":[null,3],"s":{"A":1}}`},
		{"a\xffb", "\"a\ufffdb\""},
	} {
		got, err := Marshal(x.v)
		if err != nil || !bytes.Equal(got, []byte(x.want)) && string(got) != strings.ReplaceAll(x.want, "\ufffd", `\ufffd`) {
			t.Errorf("%v:\n got %s, %v\nwant %s", x.v, got, err, x.want)
		}
	}
}

func TestInvalidUTF8IsCleaned(t *testing.T) {
	c := newCodec(signer{})
	_, frames, err := c.encode("x", nil, nil, map[string]string{}, nil)
	if err != nil {
		t.Fatal(err)
	}
	frames[5] = []byte("{\"code\":\"a\xffb\"}")
	m, err := c.decode(frames)
	if err != nil || !utf8.Valid(m.Content) || string(m.Content) != "{\"code\":\"a\ufffdb\"}" {
		t.Errorf("content %q, %v", m.Content, err)
	}
}

// FuzzDecode feeds hostile frames; the separator splits the input into frames.
func FuzzDecode(f *testing.F) {
	c := newCodec(signer{})
	_, good, err := c.encode("kernel_info_request", nil, nil, nil, [][]byte{{1}})
	if err != nil {
		f.Fatal(err)
	}
	separator := []byte("\x00")
	f.Add(bytes.Join(good, separator))
	f.Add([]byte("<IDS|MSG>"))
	f.Fuzz(func(t *testing.T, text []byte) {
		frames := bytes.Split(text, separator)
		m, err := c.decode(frames)
		if err != nil {
			if strings.Contains(err.Error(), "\n") {
				t.Errorf("error of several lines: %q", err)
			}
			return
		}
		if m.Header.Type == "" || !json.Valid(m.RawHeader) || !json.Valid(m.Content) {
			t.Errorf("accepted %s %s", m.RawHeader, m.Content)
		}
		if _, _, err := c.encode("reply", m, nil, nil, nil); err != nil {
			t.Errorf("no reply to %s: %v", hex.EncodeToString(m.RawHeader), err)
		}
	})
}
