package value

import "sync"

// Deferred is a field whose value is worked out when it is first asked for: a distance
// that takes long, beside a rank that does not. Force gives what it stands for.
type Deferred struct {
	once    sync.Once
	compute func() Value
	value   Value
}

// Later makes a deferred field.
func Later(compute func() Value) *Deferred { return &Deferred{compute: compute} }

// Kind is the kind of the value behind it.
func (d *Deferred) Kind() Kind { return Force(d).Kind() }

// Fractions marks a value to be shown as fractions; in every other use it is the value.
type Fractions struct{ Value Value }

// AsFraction marks a value to be shown as fractions.
func AsFraction(v Value) Value { return &Fractions{Force(v)} }

// Kind is the kind of the value that is shown so.
func (f *Fractions) Kind() Kind { return f.Value.Kind() }

// Force works out a deferred value and takes off the mark of how to show one; every
// other value is itself.
func Force(v Value) Value {
	switch x := v.(type) {
	case *Deferred:
		x.once.Do(func() { x.value = x.compute() })
		return x.value
	case *Fractions:
		return x.Value
	}
	return v
}
