package render

import "io"

// TraceHTML is
func TraceHTML(w io.Writer, t *Trace) error { return nil }
