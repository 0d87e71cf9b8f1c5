package render

import (
	"fmt"
	"strings"

	"speedtrail/diff/doubt"
	"speedtrail/history/assessment"
	"speedtrail/schema/unit"
)

// uncheckedWords says which doubtful data nobody looked for; nothing where all was.
func uncheckedWords(c *assessment.Computed) string {
	if len(c.Limits.Unchecked) == 0 {
		return ""
	}
	list := make([]string, len(c.Limits.Unchecked))
	for i, id := range c.Limits.Unchecked {
		list[i] = id
		if key := doubt.LimitKey(id); key != "" {
			list[i] += " (" + key + ")"
		}
	}
	return "Not looked for, as dataset.toml sets no limit in either revision: " + strings.Join(list, ", ") + "."
}

// limitWords says by which limits doubtful data was looked for, and what was not.
func limitWords(c *assessment.Computed) string {
	l := c.Limits
	var list []string
	add := func(set bool, format string, args ...any) {
		if set {
			list = append(list, fmt.Sprintf(format, args...))
		}
	}
	add(l.CantExcess > 0, "a cant excess of %d mm (cant-excess)", l.CantExcess)
	add(l.ShortestStretch > 0, "a stretch of %s m (short-stretch)", unit.Distance(l.ShortestStretch).M())
	add(l.LargestStep > 0, "a step of %d km/h (step-size)", l.LargestStep)
	text := uncheckedWords(c)
	if len(list) > 0 {
		text = strings.TrimSpace("Limits of dataset.toml for doubtful data, of each the stricter of both revisions: " + strings.Join(list, ", ") + ". " + text)
	}
	return text
}
