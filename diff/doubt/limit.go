package doubt

import "speedtrail/schema"

// LimitKey gives the limit of dataset.toml that switches a check on; empty for a
// check that is always made.
func LimitKey(id string) string {
	switch id {
	case CantExcess:
		return "cant_excess_mm"
	case ShortStretch:
		return "shortest_stretch_m"
	case StepSize:
		return "largest_step_kmh"
	}
	return ""
}

// Unchecked lists what is not looked for, as no limit for it is set: a check that
// is silently off looks like one that found nothing.
func Unchecked(l schema.Limits) []string {
	ids := []string{}
	for _, id := range IDs {
		if id == CantExcess && l.CantExcessMM == 0 || id == ShortStretch && l.ShortestStretch == 0 || id == StepSize && l.LargestStep == 0 {
			ids = append(ids, id)
		}
	}
	return ids
}
