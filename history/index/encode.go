package index

import (
	"encoding/binary"
	"errors"

	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// A route is kept as a row of varints: the id, the directions, the ends and
// jumps of the track, then for each table that restricts speeds its rows in the
// order of the file: line (from the row before), running distances of start
// (from the row before) and length, a byte of directions and delay, and the
// speeds in steps of 5 km/h behind a mask of those that are given. Names, notes,
// dates, curves, gradients and places are not kept.

type writer struct {
	data []byte
	line int
	at   unit.Distance
}

func (w *writer) uint(n uint64) { w.data = binary.AppendUvarint(w.data, n) }
func (w *writer) int(n int64)   { w.data = binary.AppendVarint(w.data, n) }
func (w *writer) text(s string) {
	w.uint(uint64(len(s)))
	w.data = append(w.data, s...)
}

// encode writes a route.
func encode(r *schema.Route) []byte {
	w := &writer{data: make([]byte, 0, 64+16*(len(r.Speed)+len(r.AxleLoad)+len(r.Temporary)))}
	w.text(r.ID)
	w.uint(uint64(r.Directions))
	segments := r.Track.Segments()
	w.int(int64(segments[0].From))
	w.int(int64(segments[len(segments)-1].To))
	w.uint(uint64(len(r.Jumps)))
	for _, j := range r.Jumps {
		w.int(int64(j.Arriving))
		w.int(int64(j.Leaving))
	}
	w.table(len(r.Speed))
	for i := range r.Speed {
		x := &r.Speed[i]
		w.row(&x.Row)
		w.data = append(w.data, byte(x.Basic/unit.SpeedStep))
		w.speeds(x.Cant[:])
		w.speeds(x.Other[:])
		mask := byte(0)
		for c, replaces := range x.Replaces {
			if replaces {
				mask |= 1 << c
			}
		}
		w.data = append(w.data, mask)
	}
	w.table(len(r.AxleLoad))
	for i := range r.AxleLoad {
		w.row(&r.AxleLoad[i].Row)
		w.speeds(r.AxleLoad[i].Limit[:])
	}
	w.table(len(r.Temporary))
	for i := range r.Temporary {
		w.row(&r.Temporary[i].Row)
		w.text(r.Temporary[i].ID)
		w.data = append(w.data, byte(r.Temporary[i].Speed/unit.SpeedStep))
	}
	return sealed(w.data)
}

func (w *writer) table(rows int) {
	w.uint(uint64(rows))
	w.line, w.at = 0, 0
}

func (w *writer) row(r *schema.Row) {
	w.int(int64(r.Pos.Line - w.line))
	w.int(int64(r.Start - w.at))
	w.uint(uint64(r.End - r.Start))
	flags := byte(r.Directions)
	if r.Delay {
		flags |= 4
	}
	w.data = append(w.data, flags)
	w.line, w.at = r.Pos.Line, r.End
}

// speeds writes those that are given.
func (w *writer) speeds(list []unit.Speed) {
	mask := uint64(0)
	for i, v := range list {
		if v != 0 {
			mask |= 1 << i
		}
	}
	w.uint(mask)
	for _, v := range list {
		if v != 0 {
			w.data = append(w.data, byte(v/unit.SpeedStep))
		}
	}
}

type reader struct {
	data []byte
	bad  bool
	line int
	at   unit.Distance
}

func (r *reader) uint() uint64 {
	n, k := binary.Uvarint(r.data)
	if k <= 0 {
		r.bad, r.data = true, nil
		return 0
	}
	r.data = r.data[k:]
	return n
}

func (r *reader) int() int64 {
	n, k := binary.Varint(r.data)
	if k <= 0 {
		r.bad, r.data = true, nil
		return 0
	}
	r.data = r.data[k:]
	return n
}

func (r *reader) byte() byte {
	if len(r.data) == 0 {
		r.bad = true
		return 0
	}
	b := r.data[0]
	r.data = r.data[1:]
	return b
}

func (r *reader) text() string {
	n := r.uint()
	if n > uint64(len(r.data)) {
		r.bad, r.data = true, nil
		return ""
	}
	s := string(r.data[:n])
	r.data = r.data[n:]
	return s
}

// count reads a number of things of which each has a byte at least.
func (r *reader) count() int {
	n := r.uint()
	if n > uint64(len(r.data)) {
		r.bad, r.data = true, nil
		return 0
	}
	r.line, r.at = 0, 0
	return int(n)
}

func (r *reader) speed() unit.Speed { return unit.Speed(r.byte()) * unit.SpeedStep }

// decode reads a route in a folder.
func decode(data []byte, folder string) (*schema.Route, error) {
	data, err := opened(data)
	if err != nil {
		return nil, err
	}
	return decodeOpened(data, folder)
}

func decodeOpened(data []byte, folder string) (*schema.Route, error) {
	r := &reader{data: data}
	out := &schema.Route{Folder: folder, ID: r.text()}
	out.Pos.File = folder + "/route.toml"
	out.Directions = codes.Directions(r.uint())
	start, end := unit.Distance(r.int()), unit.Distance(r.int())
	jumps := make([]chainage.Jump, r.count())
	for i := range jumps {
		jumps[i] = chainage.Jump{Arriving: unit.Distance(r.int()), Leaving: unit.Distance(r.int())}
		out.Jumps = append(out.Jumps, schema.JumpRow{Jump: jumps[i]})
	}
	track, err := chainage.NewTrack(start, end, jumps)
	if err != nil || r.bad {
		return nil, errors.Join(errDamaged, err)
	}
	out.Track = track
	out.Speed = make([]schema.SpeedRow, r.count())
	for i := range out.Speed {
		x := &out.Speed[i]
		r.row(&x.Row, folder+"/speed.csv")
		x.Basic = r.speed()
		r.speeds(x.Cant[:])
		r.speeds(x.Other[:])
		mask := r.byte()
		for c := range x.Replaces {
			x.Replaces[c] = mask&(1<<c) != 0
		}
	}
	out.AxleLoad = make([]schema.AxleLoadRow, r.count())
	for i := range out.AxleLoad {
		r.row(&out.AxleLoad[i].Row, folder+"/axle-load.csv")
		r.speeds(out.AxleLoad[i].Limit[:])
	}
	out.Temporary = make([]schema.TemporaryRow, r.count())
	for i := range out.Temporary {
		r.row(&out.Temporary[i].Row, folder+"/temporary.csv")
		out.Temporary[i].ID = r.text()
		out.Temporary[i].Speed = r.speed()
	}
	if r.bad || len(r.data) > 0 {
		return nil, errDamaged
	}
	return out, nil
}

func (r *reader) row(out *schema.Row, file string) {
	r.line += int(r.int())
	out.Pos = source.Position{File: file, Line: r.line}
	out.Start = r.at + unit.Distance(r.int())
	out.End = out.Start + unit.Distance(r.uint())
	flags := r.byte()
	out.Directions, out.Delay = codes.Directions(flags&3), flags&4 != 0
	r.at = out.End
}

func (r *reader) speeds(list []unit.Speed) {
	mask := r.uint()
	for i := range list {
		if mask&(1<<i) != 0 {
			list[i] = r.speed()
		}
	}
}
