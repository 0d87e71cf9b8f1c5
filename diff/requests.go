package diff

import (
	"reflect"
	"slices"

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

// requestsInPlay gives the requests that were named, by id, or those that were
// added or altered.
func requestsInPlay(base, target *schema.Dataset, names []string) ([]schema.ChangeRequest, error) {
	if len(names) == 0 {
		return RequestsInPlay(base, target), nil
	}
	var list []schema.ChangeRequest
	for _, id := range slices.Compact(slices.Sorted(slices.Values(names))) {
		i := slices.IndexFunc(target.Requests, func(q schema.ChangeRequest) bool { return q.ID == id })
		if i < 0 {
			unknown := &UnknownRequestError{ID: id}
			for _, q := range target.Requests {
				unknown.Known = append(unknown.Known, q.ID)
			}
			return nil, unknown
		}
		list = append(list, target.Requests[i])
	}
	return list, nil
}

// unplaced gives a request without the places of its parts.
func unplaced(q schema.ChangeRequest) schema.ChangeRequest {
	q.Pos = source.Position{}
	declare := make([]schema.Declaration, len(q.Declare))
	for i, d := range q.Declare {
		d.Pos, d.Places = source.Position{}, schema.Places{}
		declare[i] = d
	}
	q.Declare = declare
	return q
}
