package fleet

import (
	"speedtrail/diff/profile"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Selections lists what the rows of one side give to the trains that the
// standard can describe, each distinct selection once, in the order of the
// categories.
func Selections(c *profile.Compiler) []profile.Selection {
	distinct := func(classes []profile.Class) []profile.Class {
		var list []profile.Class
		seen := map[string]bool{}
		var key []byte
		for _, class := range classes {
			key = key[:0]
			for _, v := range c.Select(class) {
				key = append(key, byte(v/unit.SpeedStep))
			}
			if !seen[string(key)] {
				seen[string(key)] = true
				list = append(list, class)
			}
		}
		return list
	}
	static, axle := classes()
	var list []profile.Selection
	axles := distinct(axle)
	for _, class := range distinct(static) {
		for _, a := range axles {
			class.AxleLoad = a.AxleLoad
			list = append(list, c.Select(class))
		}
	}
	return list
}

// classes lists the combinations of cant deficiency and other categories, and
// the axle load categories: a row looks at the one or at the other.
func classes() (static, axle []profile.Class) {
	for c := range codes.CantDeficiency(codes.CantDeficiencies) {
		for s := range codes.CategorySet(codes.CategorySets) {
			static = append(static, profile.Class{Cant: c, Categories: s})
		}
	}
	for a := range codes.AxleLoad(codes.AxleLoads) {
		axle = append(axle, profile.Class{AxleLoad: a})
	}
	return static, axle
}
