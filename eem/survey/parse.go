package survey

// ParseSettings reads settings from bytes, such as those frozen in a model; name
// stands in messages. Faults are as with ReadSettings.
func ParseSettings(name string, data []byte) (*Settings, error) { return parseSettings(name, data) }
