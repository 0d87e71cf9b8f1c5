package index_test

import (
	"context"
	"errors"
	"path/filepath"
	"testing"

	"speedtrail/history/index"
	"speedtrail/history/trace"
)

// past asks in batches of two commits, and tells how often the index was healed.
func (d *drawn) past(t *testing.T, x *index.Index, progress func(), healing func()) (healed int) {
	t.Helper()
	_, err := x.Past(context.Background(), trace.NewReader(d.repo, ".").InBatches(2), ".", d.tip, "R1", func(int, int) { progress() }, func() {
		healed++
		healing()
	})
	if err != nil {
		t.Fatal(err)
	}
	return healed
}

func nothing() {}

// sound checks that an index holds each commit once and answers as the
// repository does.
func (d *drawn) sound(t *testing.T, file string) {
	t.Helper()
	x := mustOpen(t, file)
	if d.past(t, x, func() { t.Error("read again") }, nothing) > 0 {
		t.Error("healed again")
	}
	for _, route := range []string{"R1", "R2", "R3"} {
		d.check(t, x, d.tip, route)
	}
	if n := count(t, file, "SELECT sum(commits) FROM chunk JOIN folder ON folder.id = chunk.folder WHERE path = '.'"); n != reachable(t, d) {
		t.Errorf("%d commits in the index, %d in the repository", n, reachable(t, d))
	}
	x.Close()
}

// A damaged index is made again, once.
func TestHeal(t *testing.T) {
	d := draw(t, 1)
	file := filepath.Join(t.TempDir(), "index.db")
	d.past(t, mustOpen(t, file), nothing, nothing)
	for _, damage := range []string{
		"UPDATE chunk SET data = substr(data, 2)", "UPDATE chunk SET commits = commits + 1", "UPDATE chunk SET commits = -1", "UPDATE chunk SET first = 5",
		"UPDATE version SET data = substr(data, 3)", "UPDATE version SET data = x''", "UPDATE version SET base = id", "DELETE FROM version",
		"UPDATE change SET number = number + 99999",
	} {
		alter(t, file, damage)
		x := mustOpen(t, file)
		if n := d.past(t, x, nothing, nothing); n != 1 {
			t.Errorf("%s: healed %d times", damage, n)
		}
		x.Close()
		d.sound(t, file)
	}
}

// What cannot be healed is an error that the caller can do without, not an
// attempt without end.
func TestHealOnce(t *testing.T) {
	d := draw(t, 1)
	file := filepath.Join(t.TempDir(), "index.db")
	x := mustOpen(t, file)
	d.past(t, x, nothing, nothing)
	damage := "UPDATE version SET data = x''"
	alter(t, file, damage)
	healed, calls := 0, 0
	_, err := x.Past(context.Background(), trace.NewReader(d.repo, ".").InBatches(2), ".", d.tip, "R1", func(int, int) {
		// What was made again is damaged before it is asked. The first batch is a
		// transaction of its own.
		if calls++; calls == 1 {
			alter(t, file, damage)
		}
	}, func() { healed++ })
	if healed != 1 || !errors.Is(err, index.ErrFailed) {
		t.Errorf("healed %d times: %v", healed, err)
	}
}

// Two processes find the damage: the second one leaves alone what the first one
// has made again.
func TestHealTogether(t *testing.T) {
	d := draw(t, 1)
	file := filepath.Join(t.TempDir(), "index.db")
	d.past(t, mustOpen(t, file), nothing, nothing)
	alter(t, file, "UPDATE chunk SET data = substr(data, 2)")
	x, y := mustOpen(t, file), mustOpen(t, file)
	d.past(t, x, func() { t.Error("made again twice") }, func() {
		if n := d.past(t, y, nothing, nothing); n != 1 {
			t.Errorf("healed %d times", n)
		}
	})
	d.sound(t, file)
}

// A process that adds to an index which another one empties begins again, or
// goes on from what that one has made.
func TestEmptiedWhileAdding(t *testing.T) {
	ctx := context.Background()
	for name, another := range map[string]func(t *testing.T, d *drawn, file string){
		"healed": func(t *testing.T, d *drawn, file string) {
			y := mustOpen(t, file)
			alter(t, file, "UPDATE chunk SET data = substr(data, 2)")
			if n := d.past(t, y, nothing, nothing); n != 1 {
				t.Errorf("healed %d times", n)
			}
		},
		"made anew by another version": func(t *testing.T, d *drawn, file string) {
			alter(t, file, "PRAGMA user_version = 7")
			mustOpen(t, file)
		},
		"made anew for another folder": func(t *testing.T, d *drawn, file string) {
			alter(t, file, "PRAGMA user_version = 7")
			if err := mustOpen(t, file).Update(ctx, trace.NewReader(d.repo, "routes"), "routes", d.tip, nil); err != nil {
				t.Fatal(err)
			}
		},
	} {
		t.Run(name, func(t *testing.T) {
			for seed := range uint64(3) {
				d := draw(t, seed)
				file := filepath.Join(t.TempDir(), "index.db")
				calls := 0
				n := d.past(t, mustOpen(t, file), func() {
					// The first batch is a transaction of its own; later ones are under way.
					if calls++; calls == 1 {
						another(t, d, file)
					}
				}, nothing)
				if n > 0 {
					t.Errorf("healed %d times by the one that has seen no damage", n)
				}
				d.sound(t, file)
			}
		})
	}
}
