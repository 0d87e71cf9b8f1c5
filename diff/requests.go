package diff

import (
	"reflect"

	"speedtrail/schema"
	"speedtrail/schema/source"
)

// RequestsInPlay gives the change requests of the target that were added or
// altered since the base, in the order of their ids. Where a request stands in
// its file does not matter.
func RequestsInPlay(base, target *schema.Dataset) []schema.ChangeRequest {
	before := make(map[string]schema.ChangeRequest, len(base.Requests))
	for _, q := range base.Requests {
		before[q.ID] = q
	}
	var list []schema.ChangeRequest
	for _, q := range target.Requests {
		if old, ok := before[q.ID]; !ok || !reflect.DeepEqual(unplaced(old), unplaced(q)) {
			list = append(list, q)
		}
	}
	return list
}

// unplaced gives a request without the places of its parts.
func unplaced(q schema.ChangeRequest) schema.ChangeRequest {
	q.Pos = source.Position{}
	declare := make([]schema.Declaration, len(q.Declare))
	for i, d := range q.Declare {
		d.Pos = source.Position{}
		declare[i] = d
	}
	q.Declare = declare
	return q
}
