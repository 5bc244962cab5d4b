package lrt

import (
	"crypto/sha256"
	"errors"
	"fmt"
	"io"
	"sync"
)

// ErrNoDigest is returned by ID.Digest for content that cannot write itself.
var ErrNoDigest = errors.New("lrt: content has no digest")

// ID names immutable content: the rows of a data set, a response, a column of
// weights. Two IDs from one NewID call are the same content at once; otherwise
// the content is compared by a SHA-256 digest, computed once and only when it
// is asked for. The zero ID names nothing (no weights, say) and equals only
// itself. An ID is safe for concurrent use.
type ID struct{ p *identity }

type identity struct {
	write func(io.Writer) error
	once  sync.Once
	sum   [sha256.Size]byte
	err   error
}

// NewID returns a new identity. The function write must write the content in a
// canonical form, the same bytes for the same content on every machine; nil
// means that the content cannot be digested, so that the ID equals itself only.
// The content must not change afterwards.
func NewID(write func(io.Writer) error) ID { return ID{&identity{write: write}} }

// IsZero reports whether the ID names nothing.
func (a ID) IsZero() bool { return a.p == nil }

// Digest returns the SHA-256 digest of the content, ErrNoDigest when it has
// none (the zero ID too), or the error of writing it.
func (a ID) Digest() ([sha256.Size]byte, error) {
	if a.p == nil || a.p.write == nil {
		return [sha256.Size]byte{}, ErrNoDigest
	}
	a.p.once.Do(func() {
		h := sha256.New()
		if a.p.err = a.p.write(h); a.p.err == nil {
			h.Sum(a.p.sum[:0])
		}
	})
	return a.p.sum, a.p.err
}

// Same reports whether a and b name the same content: in constant time when
// they are one identity, else by digest. Content without a digest is the same
// only as itself.
func (a ID) Same(b ID) bool {
	if a.p == b.p {
		return true
	}
	if a.p == nil || b.p == nil {
		return false
	}
	x, err := a.Digest()
	if err != nil {
		return false
	}
	y, err := b.Digest()
	return err == nil && x == y
}

// undigested reports whether the content has an identity but cannot write itself.
func (a ID) undigested() bool { return a.p != nil && a.p.write == nil }

// String returns the first digits of the digest, "none" for the zero ID and
// "undigested" where there is no digest.
func (a ID) String() string {
	if a.p == nil {
		return "none"
	}
	d, err := a.Digest()
	if err != nil {
		return "undigested"
	}
	return fmt.Sprintf("%x", d[:6])
}

// Observations say what a space was bound to: the rows used (after missing
// values were dealt with), the response, and the weights. Two spaces can be
// compared only when all three are the same. An offset belongs to the space,
// not to the observations, and the row count is known only after the fit.
type Observations struct{ Rows, Response, Weights ID }

// Check returns nil when o and other are the same observations, else an error
// wrapping ErrDifferentObservations that says which part differs.
func (o Observations) Check(other Observations) error {
	switch {
	case !o.Rows.Same(other.Rows):
		if o.Rows.undigested() && other.Rows.undigested() {
			return fmt.Errorf("%w: two samples without a digest: derive both spaces from one lrt.Observe", ErrDifferentObservations)
		}
		return fmt.Errorf("%w: different rows (fit both on the rows complete for both)", ErrDifferentObservations)
	case !o.Response.Same(other.Response):
		return fmt.Errorf("%w: different response", ErrDifferentObservations)
	case !o.Weights.Same(other.Weights):
		return fmt.Errorf("%w: different weights", ErrDifferentObservations)
	}
	return nil
}

// Sample is a user's data with an identity that every model bound to it
// shares. Do not modify Value after Observe.
type Sample[D any] struct {
	Value D
	N     int // number of observations
	obs   Observations
}

// Observe gives data of n observations an identity. Two separate calls never
// make comparable samples, even of equal data, unless D has a method
// WriteContent(io.Writer) error that writes it canonically: derive the models of
// one comparison from one Sample.
func Observe[D any](value D, n int) Sample[D] {
	var write func(io.Writer) error
	if w, ok := any(value).(interface{ WriteContent(io.Writer) error }); ok {
		write = w.WriteContent
	}
	id := NewID(write)
	return Sample[D]{Value: value, N: n, obs: Observations{Rows: id, Response: id}}
}

// Observations returns the identity of the sample.
func (s Sample[D]) Observations() Observations { return s.obs }
