package audit

// Defaults returns the tolerances that stand behind zero [Options].
func Defaults() Options { return Options{}.withDefaults() }
