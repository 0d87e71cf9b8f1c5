package assessment_test

import (
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// A stored document of which something points to nothing, or lies where nothing can,
// is not read: what is drawn from it could fail, or not end.
func TestDecodeRefuses(t *testing.T) {
	files := texts{"requests/a.toml": "id = \"CR-1\"\ntitle = \"x\"\nreason = \"y\"\n[[declares]]\nroute = \"R1\"\nfrom_km = 4\nto_km = 6\neffect = \"any\"\n"}
	files["speed.csv"] = "from_km,to_km,basic\n0,4,100\n4,6,110\n6,20,100\n"
	files["curves.csv"] = "from_km,to_km,radius_m,cant_mm\n4,5,900,100\n"
	with := func(alter func(*assessment.Computed)) error {
		c := compute(t, nil, files, nil)
		if len(c.Routes) != 1 || len(c.Routes[0].Changes) == 0 || len(c.Stretches.List) == 0 || len(c.Stretches.List[0].Before) == 0 || len(c.Figures.Curves) == 0 {
			t.Fatal("the document holds too little to be altered")
		}
		alter(c)
		body, _, err := (&assessment.Document{Computed: *c, Format: assessment.Format}).Encode()
		if err != nil {
			t.Fatal(err)
		}
		_, _, err = assessment.Decode(body)
		return err
	}
	if err := with(func(*assessment.Computed) {}); err != nil {
		t.Fatal(err)
	}
	const absent, cannot = "points to what is not there", "that cannot be"
	for name, x := range map[string]struct {
		alter func(*assessment.Computed)
		want  string
	}{
		"a source before":           {func(c *assessment.Computed) { c.Routes[0].Changes[0].BeforeSource = 99 }, absent},
		"a source after":            {func(c *assessment.Computed) { c.Routes[0].Changes[0].AfterSource = -1 }, absent},
		"a cause":                   {func(c *assessment.Computed) { c.Routes[0].Changes[0].Cause = 99 }, absent},
		"pieces":                    {func(c *assessment.Computed) { c.Routes[0].Changes[0].Pieces = 99 }, absent},
		"a declaration":             {func(c *assessment.Computed) { c.Requests = nil }, absent},
		"a train of a change":       {func(c *assessment.Computed) { c.Routes[0].Changes[0].Trains[0] = 99 }, absent},
		"a row of a cause":          {func(c *assessment.Computed) { c.Routes[0].Causes[0][0].Row = 99 }, absent},
		"a file of a cause":         {func(c *assessment.Computed) { c.Routes[0].Causes[0][0].File = -1 }, absent},
		"a route of a stretch":      {func(c *assessment.Computed) { c.Stretches.List[0].Route = 1 }, absent},
		"a change of a stretch":     {func(c *assessment.Computed) { c.Stretches.List[0].Changes[0] = 99 }, absent},
		"no change of a stretch":    {func(c *assessment.Computed) { c.Stretches.List[0].Changes = nil }, absent},
		"a train of a stretch":      {func(c *assessment.Computed) { c.Stretches.List[0].Trains[0] = 99 }, absent},
		"a source of a step before": {func(c *assessment.Computed) { c.Stretches.List[0].Before[0].Source = 99 }, absent},
		"a source of a step after":  {func(c *assessment.Computed) { c.Stretches.List[0].After[0].Source = 99 }, absent},
		"a train of a curve":        {func(c *assessment.Computed) { c.Figures.Curves[0].Trains[0] = 99 }, absent},
		"a speed before":            {func(c *assessment.Computed) { c.Routes[0].Changes[0].Before = -5 }, cannot},
		"a speed after":             {func(c *assessment.Computed) { c.Routes[0].Changes[0].After = 1e15 }, cannot},
		"a start":                   {func(c *assessment.Computed) { c.Routes[0].Changes[0].Start = -1 }, cannot},
		"a length":                  {func(c *assessment.Computed) { c.Routes[0].Changes[0].Length = 1 << 52 }, cannot},
		"a speed of a step":         {func(c *assessment.Computed) { c.Stretches.List[0].After[0].Speed = 605 }, cannot},
		"a step that ends first":    {func(c *assessment.Computed) { c.Stretches.List[0].Before[0].To = -1 }, cannot},
		"a window":                  {func(c *assessment.Computed) { c.Stretches.List[0].WindowTo = 1 << 50 }, cannot},
		"the length of the route":   {func(c *assessment.Computed) { c.Stretches.List[0].RouteLength = 1 << 52 }, cannot},
		"the approved commit":       {func(c *assessment.Computed) { c.PreparedSince = "HEAD" }, "no hash"},
	} {
		t.Run(name, func(t *testing.T) {
			if err := with(x.alter); err == nil || !strings.Contains(err.Error(), x.want) {
				t.Errorf("got %v, want an error with %q", err, x.want)
			}
		})
	}
}
