package schema

import (
	_ "embed"
	"slices"
	"strings"
	"sync"
)

// zones are the names of the IANA database that this program carries along, a line
// each, in byte order.
//
//go:embed zones.txt
var zones string

var zoneNames = sync.OnceValue(func() []string { return strings.Fields(zones) })

// knownZone tells whether a name is that of a time zone everywhere. A machine's own
// database has more: "localtime" and "posixrules" are what its owner has chosen, "right/"
// counts leap seconds, and where files have names without letter case, so do zones. By
// such a name the same data would say one thing here and another there, or be faulty,
// and an assessment that is recorded here be wrong there.
func knownZone(name string) bool {
	_, ok := slices.BinarySearch(zoneNames(), name)
	return ok
}
