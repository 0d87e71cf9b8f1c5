package align

// Unshared lists where elements hold that only one of two lists has, in order and
// without overlap. Both lists are in the order of compare; two elements that it finds
// equal are shared where same says so. Elements of one place that stand in another
// order on the two sides count as not shared, which is only more than is needed.
func Unshared[T any](base, target []T, compare func(a, b *T) int, same func(a, b *T) bool, where func(*T) Interval) []Interval {
	var list []Interval
	i, k := 0, 0
	for i < len(base) || k < len(target) {
		order := 0
		switch {
		case i == len(base):
			order = 1
		case k == len(target):
			order = -1
		default:
			order = compare(&base[i], &target[k])
		}
		if order == 0 && same(&base[i], &target[k]) {
			i, k = i+1, k+1
			continue
		}
		if order <= 0 {
			list = append(list, where(&base[i]))
			i++
		}
		if order >= 0 {
			list = append(list, where(&target[k]))
			k++
		}
	}
	return Union(list)
}
