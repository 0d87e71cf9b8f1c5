package render

import "fmt"

// Elsewhere is the folder of an older anchor of the same ledger whose policies know the
// name of a signer and not his key. The signature obeys the policy of its own folder,
// which anybody can have written, and the name may be that of somebody else.
type Elsewhere struct {
	Anchor int64  `json:"anchor"` // its entry
	Folder string `json:"folder"`
}

// Short says it in a list; it is empty where there is no such folder.
func (e *Elsewhere) Short() string {
	if e == nil {
		return ""
	}
	return fmt.Sprintf("the folder %s, anchored in entry %d, has no such key of this name; ask who signed", e.Folder, e.Anchor)
}

// Behind says it behind the key.
func (e *Elsewhere) Behind() string {
	if e == nil {
		return ""
	}
	return "; ! " + e.Short()
}
