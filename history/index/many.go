package index

import (
	"context"
	"database/sql"
	"database/sql/driver"
	"errors"

	"speedtrail/history/trace"
)

// addVersionsOfMany adds versions that may be there already, added by another
// process.
func (b *builder) addVersionsOfMany(ctx context.Context, list []*trace.Loaded) error {
	if b.depths == nil {
		b.depths = map[int64]int{}
	}
	for _, v := range list {
		var id int64
		var place, route, fault string
		err := b.find.QueryRowContext(ctx, v.Tree[:], v.Zone).Scan(&id, &place, &route, &fault)
		if errors.Is(err, sql.ErrNoRows) {
			id, err = b.addOne(ctx, v)
		}
		if err != nil {
			return err
		}
		b.setID(v.Key, id)
	}
	return nil
}

func (b *builder) addOne(ctx context.Context, v *trace.Loaded) (id int64, err error) {
	base, data, err := b.packed(v)
	if err != nil {
		return 0, err
	}
	depth := 0
	if on, ok := base.(int64); ok {
		below, err := b.depth(ctx, on)
		if err != nil {
			return 0, err
		}
		if depth = below + 1; depth > longestChain {
			// The packer counted by what this process has read, but another one has
			// laid the base on a chain of its own.
			if data, err = b.whole(ctx, on, data.([]byte)); err != nil {
				return 0, err
			}
			base, depth = nil, 0
		}
	}
	if err := b.addVersion.QueryRowContext(ctx, v.Tree[:], v.Zone, v.Folder, v.ID, v.Fault, base, data).Scan(&id); err != nil {
		return 0, err
	}
	b.depths[id] = depth
	return id, nil
}

// depth counts the versions below one, longestChain at most.
func (b *builder) depth(ctx context.Context, id int64) (int, error) {
	if n, ok := b.depths[id]; ok {
		return n, nil
	}
	n := 0
	for at := id; n < longestChain; n++ {
		var base sql.NullInt64
		err := b.baseOf.QueryRowContext(ctx, at).Scan(&base)
		if errors.Is(err, sql.ErrNoRows) {
			err = errDamaged
		}
		if err != nil {
			return 0, err
		}
		if !base.Valid {
			break
		}
		at = base.Int64
		if below, ok := b.depths[at]; ok {
			n = min(n+1+below, longestChain)
			break
		}
	}
	b.depths[id] = n
	return n, nil
}

// whole gives the version that has a difference to another one.
func (b *builder) whole(ctx context.Context, base int64, difference []byte) (driver.Value, error) {
	r := row{id: base}
	if err := b.x.conn.QueryRowContext(ctx, "SELECT base, data FROM version WHERE id = ?", base).Scan(&r.base, &r.data); err != nil {
		return nil, err
	}
	u := &unpacker{ctx: ctx, x: b.x, rows: map[int64]row{}, whole: map[int64][]byte{}}
	before, err := u.unpack(r)
	if err != nil {
		return nil, err
	}
	data, err := apply(before, difference)
	if err != nil {
		return nil, err
	}
	_, err = opened(data)
	return data, err
}
