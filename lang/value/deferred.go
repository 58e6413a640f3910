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

// Force works out a deferred value; every other value is itself.
func Force(v Value) Value {
	d, ok := v.(*Deferred)
	if !ok {
		return v
	}
	d.once.Do(func() { d.value = d.compute() })
	return d.value
}
