package ledger_test

import (
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"testing"

	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// sector is how much a disk writes whole or not at all.
const sector = 512

// loss says what of the calls that no sync has made safe has reached the disk
// when the power goes.
type loss struct {
	name string
	// keep tells how much of a write reached it: from and to in its data. Other
	// calls have it all where to is not 0.
	keep func(i int, c call) (from, to int)
	// names is how many of the calls that make or delete a file reached it: the
	// folder keeps their order.
	names int
	// hole is what stands where a file became longer and nothing was written.
	hole byte
}

func whole(_ int, c call) (int, int)   { return 0, max(1, len(c.data)) }
func nothing(_ int, _ call) (int, int) { return 0, 0 }

// losses are the ways in which the first calls can be lost. What a disk may do is
// taken from the documents of SQLite (Atomic Commit In SQLite, sections 2 and 9):
// unsynced writes reach it in any order or not at all, a write may be torn between
// sectors, and no write harms bytes beside it.
func losses(log []call, random *rand.Rand) []loss {
	last := len(log) - 1
	list := []loss{{"all reached the disk", whole, len(log), 0}, {"what was not synced is lost", nothing, 0, 0}}
	if last >= 0 && len(log[last].data) > sector {
		for _, torn := range []struct {
			name   string
			others func(int, call) (int, int)
			names  int
		}{{"the last write is torn", whole, len(log)}, {"of what was not synced only a torn last write reached the disk", nothing, len(log)}} {
			list = append(list, loss{torn.name, func(i int, c call) (int, int) {
				if i == last {
					return 0, sector
				}
				return torn.others(i, c)
			}, torn.names, 0})
		}
	}
	for range 2 {
		parts := make([][2]int, len(log))
		for i, c := range log {
			from, to := whole(i, c)
			switch random.IntN(4) {
			case 0:
				to = 0
			case 1:
				to = min(to, sector*(1+random.IntN(8)))
			case 2:
				from = min(to, sector*random.IntN(8))
			}
			parts[i] = [2]int{from, to}
		}
		list = append(list, loss{"by chance", func(i int, _ call) (int, int) { return parts[i][0], parts[i][1] }, random.IntN(len(log) + 1), byte(random.Uint32())})
	}
	return list
}

// stored is the content of a file, whatever its name is.
type stored struct{ content []byte }

func (s *stored) grow(size int, hole byte) {
	for len(s.content) < size {
		s.content = append(s.content, hole)
	}
}

// survivors gives what the files hold after the calls of a log and the loss of
// power.
func survivors(before map[string][]byte, log []call, l loss) map[string][]byte {
	// By name as the process saw them, and as they are on the disk.
	files, disk := map[string]*stored{}, map[string]*stored{}
	for name, content := range before {
		s := &stored{slices.Clone(content)}
		files[name], disk[name] = s, s
	}
	// Which file a call meant: names come back.
	of := make([]*stored, len(log))
	for i, c := range log {
		if c.kind == creation {
			files[c.file] = &stored{}
		}
		of[i] = files[c.file]
	}
	safe := func(i int) bool {
		if c := log[i]; c.kind == creation || c.kind == deletion {
			return slices.ContainsFunc(log[i:], func(c call) bool { return c.dir })
		}
		for j := i + 1; j < len(log); j++ {
			if log[j].kind == syncing && of[j] == of[i] {
				return true
			}
		}
		return false
	}
	for i, c := range log {
		s := of[i]
		from, to := whole(i, c)
		if !safe(i) {
			from, to = l.keep(i, c)
		}
		kept := safe(i) || i < l.names
		switch c.kind {
		case creation:
			if kept {
				disk[c.file] = s
			}
		case deletion:
			if kept {
				delete(disk, c.file)
			}
		case writing:
			if from < to {
				s.grow(int(c.off)+to, l.hole)
				copy(s.content[int(c.off)+from:], c.data[from:to])
			}
		case truncation:
			if to > 0 {
				s.grow(int(c.off), l.hole)
				s.content = s.content[:c.off]
			}
		}
	}
	after := map[string][]byte{}
	for name, s := range disk {
		after[name] = append([]byte{}, s.content...)
	}
	return after
}

// The power goes after every call of everything that is done to a ledger. What
// the disk then holds is a whole ledger, the one before or the one after, and
// the one after where it was reported as recorded; a head that was noted proves
// it or is said to be missing.
func TestPowerLoss(t *testing.T) {
	for _, d := range deeds {
		t.Run(d.name, func(t *testing.T) {
			random := rand.New(rand.NewPCG(1, 2))
			disk := useDisk(t)
			file := filepath.Join(quickDir(t), "ledger.db")
			template, before := d.template(t, newInspector(t))
			files := map[string][]byte{}
			if template != nil {
				files["ledger.db"] = template
				if err := os.WriteFile(file, template, 0o644); err != nil {
					t.Fatal(err)
				}
			}
			l, head, err := d.run(t.Context(), file, func() { disk.set(fault{}, true) })
			if err != nil {
				t.Fatal(err)
			}
			disk.report(head.String())
			l.Close()
			_, _, log := disk.state()
			disk.set(fault{}, false)
			if len(log) < 10 || log[len(log)-1].reported == "" {
				t.Fatal("the calls were not written down: ", log)
			}
			d.head = head
			noted := []chain.Head{head}
			if before.format != 0 && before.head != head {
				noted = append(noted, before.head)
			}
			eyes := newInspector(t, noted...)
			states := map[found]int{}
			for n := range len(log) + 1 {
				for _, way := range losses(log[:n], random) {
					after := survivors(files, log[:n], way)
					got, err := eyes.content(t.Context(), after["ledger.db"], after["ledger.db-journal"])
					states[got]++
					reported := n == len(log)
					next := ""
					if n < len(log) {
						next = log[n].String()
					}
					switch {
					case err != nil:
						t.Errorf("after %d calls, before the %s, %s: %v", n, next, way.name, err)
					case reported && got.head != head, reported && got.format != ledger.Format:
						t.Errorf("%s: %v was reported as recorded, the disk holds %v", way.name, head, got)
					case got != before && (got.head != head || got.format != ledger.Format):
						t.Errorf("after %d calls, before the %s, %s: neither the ledger before nor the one after: %v", n, next, way.name, got)
					}
				}
			}
			t.Logf("%d calls, %d contents of the disk, the ledger before %d times, the one after %d times", len(log)-1, len(eyes.seen), states[before], states[found{ledger.Format, head}])
			if len(states) != 2 {
				t.Errorf("%d states were seen, the one before and the one after were to be", len(states))
			}
		})
	}
}
