package main

import (
	"testing"
	"time"

	"speedtrail/schema"
)

// A day of --on is the one that the dates of restrictions mean, also where the clocks
// go forward over midnight: to Havana's 8 March 2026 belong the 23 hours from
// 05:00Z on, to Cairo's 24 April those from 22:00Z of the day before.
func TestOnDay(t *testing.T) {
	for _, c := range []struct {
		zone, on, from, until string // of the restriction
		want                  bool
	}{
		{"America/Havana", "2026-03-08", "2026-03-09T03:30:00Z", "2026-03-09T04:30:00Z", true}, // from 23:30 on
		{"America/Havana", "2026-03-08", "2026-03-09T04:00:00Z", "2026-03-10T04:00:00Z", false},
		{"America/Havana", "2026-03-08", "2026-03-07T05:00:00Z", "2026-03-08T05:00:00Z", false}, // the day before
		{"America/Havana", "2026-03-07", "2026-03-08T04:30:00Z", "2026-03-08T05:00:00Z", true},  // from 23:30 on
		{"Africa/Cairo", "2026-04-24", "2026-04-23T22:00:00Z", "2026-04-23T22:30:00Z", true},
		{"Africa/Cairo", "2026-04-24", "2026-04-24T21:00:00Z", "2026-04-25T21:00:00Z", false}, // the day after
		{"Africa/Cairo", "2026-04-23", "2026-04-23T22:00:00Z", "2026-04-24T21:00:00Z", false},
		{"UTC", "2026-03-08", "2026-03-08T23:59:59Z", "2026-03-09T00:00:00Z", true},
		{"UTC", "2026-03-08", "2026-03-09T00:00:00Z", "2026-03-10T00:00:00Z", false},
		{"UTC", "2026-03-08T12:00:00Z", "2026-03-08T12:00:00Z", "2026-03-08T12:00:01Z", true},
		{"UTC", "2026-03-08T12:00:00Z", "2026-03-08T11:00:00Z", "2026-03-08T12:00:00Z", false},
	} {
		t.Run(c.zone+" "+c.on+" "+c.from, func(t *testing.T) {
			zone, ok := schema.Zone(c.zone)
			if !ok {
				t.Fatal(c.zone)
			}
			filter, err := inForce(c.on, zone)
			if err != nil {
				t.Fatal(err)
			}
			var row schema.TemporaryRow
			for text, to := range map[string]*time.Time{c.from: &row.Valid.From, c.until: &row.Valid.Until} {
				if *to, err = time.Parse(time.RFC3339, text); err != nil {
					t.Fatal(err)
				}
			}
			if got := filter(&row); got != c.want {
				t.Errorf("counts: %v, want %v", got, c.want)
			}
		})
	}
}
