package wire

import (
	"crypto"
	"crypto/hmac"
	_ "crypto/md5" // the schemes that the protocol's clients can name
	_ "crypto/sha1"
	_ "crypto/sha256"
	_ "crypto/sha3"
	_ "crypto/sha512"
	"encoding/hex"
	"fmt"
	"strings"
	"sync"
)

// schemes are the hashes that may follow "hmac-".
var schemes = map[string]crypto.Hash{
	"md5":      crypto.MD5,
	"sha1":     crypto.SHA1,
	"sha224":   crypto.SHA224,
	"sha256":   crypto.SHA256,
	"sha384":   crypto.SHA384,
	"sha512":   crypto.SHA512,
	"sha3_224": crypto.SHA3_224,
	"sha3_256": crypto.SHA3_256,
	"sha3_384": crypto.SHA3_384,
	"sha3_512": crypto.SHA3_512,
}

// signer makes and checks the signatures of messages. Its zero value neither
// signs nor checks.
type signer struct {
	hash crypto.Hash
	key  []byte
}

func newSigner(scheme, key string) (signer, error) {
	name, ok := strings.CutPrefix(scheme, "hmac-")
	hash := schemes[name]
	if !ok || hash == 0 || !hash.Available() {
		return signer{}, fmt.Errorf("signature_scheme %q is not supported; use hmac-sha256", scheme)
	}
	return signer{hash: hash, key: []byte(key)}, nil
}

// sign returns the signature of the four parts of a message in hexadecimal
// digits; without a key it is empty.
func (s signer) sign(parts [][]byte) []byte {
	if len(s.key) == 0 {
		return nil
	}
	mac := hmac.New(s.hash.New, s.key)
	for _, p := range parts {
		mac.Write(p)
	}
	return hex.AppendEncode(nil, mac.Sum(nil))
}

// verify reports whether signature is that of parts.
func (s signer) verify(signature []byte, parts [][]byte) bool {
	return len(s.key) == 0 || hmac.Equal(signature, s.sign(parts))
}

// rememberedSignatures is how many of the latest signatures are kept to refuse
// repeated messages.
const rememberedSignatures = 1 << 16

// replays remembers signatures that were seen. It is safe for concurrent use.
type replays struct {
	mu    sync.Mutex
	seen  map[string]bool
	order []string // ring, oldest at next once full
	next  int
}

// add reports whether signature is new and remembers it.
func (r *replays) add(signature []byte) bool {
	r.mu.Lock()
	defer r.mu.Unlock()
	key := string(signature)
	if r.seen[key] {
		return false
	}
	if r.seen == nil {
		r.seen = make(map[string]bool)
	}
	r.seen[key] = true
	if len(r.order) < rememberedSignatures {
		r.order = append(r.order, key)
		return true
	}
	delete(r.seen, r.order[r.next])
	r.order[r.next] = key
	r.next = (r.next + 1) % rememberedSignatures
	return true
}
