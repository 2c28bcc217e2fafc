package render

import (
	"embed"
	"strings"
)

//go:embed schema/*.json
var schemas embed.FS

// SchemaNames lists the JSON Schemas, sorted.
func SchemaNames() []string {
	entries, err := schemas.ReadDir("schema")
	if err != nil {
		panic(err) // the folder is part of the program
	}
	var names []string
	for _, e := range entries {
		names = append(names, strings.TrimSuffix(e.Name(), ".json"))
	}
	return names
}

// Schema returns the JSON Schema (draft 2020-12) of that name, such as "solve".
func Schema(name string) (string, bool) {
	b, err := schemas.ReadFile("schema/" + name + ".json")
	return string(b), err == nil
}
