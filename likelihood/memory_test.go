package likelihood

import (
	"math"
	"runtime"
	"slices"
	"sync"
	"sync/atomic"
	"testing"

	"omen/data"
)

// notes is a memory that a test can look into.
type notes struct {
	keys, entries [][]float64
	recalled      int
}

func (n *notes) Recall(key []float64) ([]float64, bool) {
	i := slices.IndexFunc(n.keys, func(k []float64) bool { return slices.Equal(k, key) })
	if i < 0 {
		return nil, false
	}
	n.recalled++
	return n.entries[i], true
}

func (n *notes) Keep(key, x []float64) {
	n.keys, n.entries = append(n.keys, slices.Clone(key)), append(n.entries, slices.Clone(x))
}

// densities is a posterior in a few places, by its condensed form and over all rows.
func densities(p *Posterior) (out []float64) {
	e, d := p.Evaluator(), p.Direct().Evaluator()
	for _, x := range [][]float64{{0.3, 0.7}, {0.2, 0.5}, {0.9, 0.1}, {0.1, 1.18}} {
		for len(x) < p.space.Dim() {
			x = append(x, []float64{70, -19.3}[len(x)-2])
		}
		out = append(out, e.LogDensity(x), d.LogDensity(x))
	}
	return out
}

// A table whose condensed form is remembered has the same posterior to the last bit,
// without its noise being looked at until an evaluation goes over all rows.
func TestRemember(t *testing.T) {
	table, templates := survey(1, 300, 5)
	full := correlate(t, written(table.Err, templates))
	f, n := curvedFamily(t), &notes{}
	want := densities(posterior(t, f, must[*Supernovae](t)(NewSupernovae(table, full, Offset{}, Standing{}))))
	for _, what := range []string{"first", "second", "third, from an entry of another length,"} {
		calls := 0
		sn := must[*Supernovae](t)(NewSupernovae(table, Deferred(300, func() Noise { calls++; return full }), Offset{}, Standing{}))
		sn.Remember(n)
		p := posterior(t, f, sn)
		if (calls == 0) != (what == "second") {
			t.Errorf("%s time: the noise was made %d times", what, calls)
		}
		if got := densities(p); !slices.Equal(got, want) {
			t.Errorf("%s time: %v, want %v", what, got, want)
		}
		if calls != 1 {
			t.Errorf("%s time: the noise was made %d times", what, calls)
		}
		if what == "second" {
			n.entries[0] = n.entries[0][1:]
		}
	}
	if n.recalled != 2 {
		t.Errorf("recalled %d times", n.recalled)
	}
}

// Nothing that a condensed form depends on can change without its key. All tables
// have the same noise here, as a memory is for one.
func TestRememberTellsApart(t *testing.T) {
	base, _ := survey(1, 200, 0)
	table := func(change func(*data.Supernovae)) *data.Supernovae {
		sn := *base
		sn.Z, sn.ZHel, sn.Value = slices.Clone(sn.Z), slices.Clone(sn.ZHel), slices.Clone(sn.Value)
		change(&sn)
		return &sn
	}
	another, _ := survey(2, 80, 0)
	unremembered := must[*Supernovae](t)(NewSupernovae(another, nil, Offset{Kind: NormalOffset, Mean: -19, SD: 1}, Standing{}))
	farther := table(func(sn *data.Supernovae) { sn.Z[0] = 2.4 })
	up := func(x *float64) { *x = math.Nextafter(*x, math.Inf(1)) }
	same := func(*data.Supernovae) {}
	normal := Offset{Kind: NormalOffset, Mean: -19.3, SD: 0.1}
	n := &notes{}
	for i, c := range []struct {
		what   string
		table  *data.Supernovae
		offset Offset
		others []Term
	}{
		{"as it is", base, Offset{}, nil},
		{"a redshift", table(func(sn *data.Supernovae) { sn.Z[7] += 0.01 }), Offset{}, nil},
		{"a redshift in its last bit", table(func(sn *data.Supernovae) { up(&sn.Z[7]) }), Offset{}, nil},
		{"a heliocentric redshift", table(func(sn *data.Supernovae) { sn.ZHel[7] += 0.01 }), Offset{}, nil},
		{"a magnitude", table(func(sn *data.Supernovae) { sn.Value[7] += 0.01 }), Offset{}, nil},
		{"a magnitude in its last bit", table(func(sn *data.Supernovae) { up(&sn.Value[7]) }), Offset{}, nil},
		{"two rows exchanged", table(func(sn *data.Supernovae) {
			sn.Z[0], sn.Z[1], sn.Value[0], sn.Value[1] = sn.Z[1], sn.Z[0], sn.Value[1], sn.Value[0]
		}), Offset{}, nil},
		{"an absolute offset", base, Offset{Kind: AbsoluteOffset}, nil},
		{"moduli", table(func(sn *data.Supernovae) { sn.Absolute = true }), Offset{Kind: AbsoluteOffset}, nil},
		{"a normal offset", base, normal, nil},
		{"another mean", base, Offset{NormalOffset, -19.2, 0.1}, nil},
		{"another width", base, Offset{NormalOffset, -19.3, 0.2}, nil},
		{"beside a table that needs H0", base, Offset{}, []Term{unremembered}},
		{"beside a table that goes farther", base, Offset{}, []Term{must[*Supernovae](t)(NewSupernovae(farther, nil, Offset{}, Standing{}))}},
	} {
		build := func(m Memory) *Posterior {
			f := curvedFamily(t)
			f.Free = append(f.Free, param(t, "H0", 60, 80), param(t, "M", -20, -19))
			sn := must[*Supernovae](t)(NewSupernovae(c.table, nil, c.offset, Standing{}))
			if m != nil {
				sn.Remember(m)
			}
			return posterior(t, f, append([]Term{sn}, c.others...)...)
		}
		want := densities(build(nil))
		for range 2 {
			if got := densities(build(n)); !slices.Equal(got, want) {
				t.Errorf("%s: %v, want %v", c.what, got, want)
			}
		}
		if len(n.keys) != i+1 || n.recalled != i+1 {
			t.Errorf("%s: %d entries, recalled %d times, want %d each", c.what, len(n.keys), n.recalled, i+1)
		}
	}
	// What stands beside the rows is not part of the form.
	for _, standing := range []Standing{{}, {Rows: 9000, Chi2: 123}} {
		sn := must[*Supernovae](t)(NewSupernovae(table(same), nil, Offset{}, standing))
		sn.Remember(n)
		f := curvedFamily(t)
		want := posterior(t, f, must[*Supernovae](t)(NewSupernovae(base, nil, Offset{}, standing)))
		if got := densities(posterior(t, f, sn)); !slices.Equal(got, densities(want)) {
			t.Errorf("%v: %v", standing, got)
		}
	}
	if len(n.keys) != 14 {
		t.Errorf("%d entries", len(n.keys))
	}
}

// The condensed form has the same bits however many processors computed it.
func TestCondensedOnAnyProcessors(t *testing.T) {
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(0))
	table, templates := survey(1, 300, 5)
	full := correlate(t, written(table.Err, templates))
	var want []float64
	for _, n := range []int{1, 2, 3, 8} {
		runtime.GOMAXPROCS(n)
		kept := &notes{}
		sn := must[*Supernovae](t)(NewSupernovae(table, full, Offset{}, Standing{}))
		sn.Remember(kept)
		posterior(t, curvedFamily(t), sn)
		if n > 1 && !slices.Equal(kept.entries[0], want) {
			t.Errorf("%d processors condense to other numbers", n)
		}
		want = kept.entries[0]
	}
}

// Whichever evaluator first needs a deferred noise makes it, for all of them.
func TestDeferredOnce(t *testing.T) {
	table, templates := survey(1, 100, 5)
	full := correlate(t, written(table.Err, templates))
	f, n := curvedFamily(t), &notes{}
	build := func(noise Noise) *Posterior {
		sn := must[*Supernovae](t)(NewSupernovae(table, noise, Offset{}, Standing{}))
		sn.Remember(n)
		return posterior(t, f, sn).Direct()
	}
	want := build(full).Evaluator().LogDensity([]float64{0.3, 0.7})
	var calls atomic.Int32
	d := build(Deferred(100, func() Noise { calls.Add(1); return full }))
	var group sync.WaitGroup
	for range 8 {
		group.Go(func() {
			if got := d.Evaluator().LogDensity([]float64{0.3, 0.7}); got != want {
				t.Errorf("log-density %v, want %v", got, want)
			}
		})
	}
	group.Wait()
	if n := calls.Load(); n != 1 {
		t.Errorf("the noise was made %d times", n)
	}
}
