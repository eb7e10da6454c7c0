package main

import (
	"encoding/json"
	"fmt"
	"math"

	"tarnlight/eem"
)

// The lines of --json: one JSON object a line, described by events.schema.json.

type startEvent struct {
	Event   string `json:"event"` // start
	Version string `json:"version"`
	Verb    string `json:"verb"`
	Survey  string `json:"survey"`
}

type filesEvent struct {
	Event string `json:"event"` // files
	Count int    `json:"count"`
	As    string `json:"as"`
	First string `json:"first"`
}

type findingEvent struct {
	Event     string   `json:"event"` // finding
	Severity  string   `json:"severity"`
	Test      string   `json:"test"`
	ID        string   `json:"id"`
	Batch     string   `json:"batch"`
	Component string   `json:"component"`
	Method    string   `json:"method"`
	Value     *float64 `json:"value"`
	Limit     *float64 `json:"limit"`
	Message   string   `json:"message"`
	File      string   `json:"file"`
	Line      int      `json:"line"`
}

type doneEvent struct {
	Event  string `json:"event"` // done
	Out    string `json:"out"`
	Status status `json:"status"`
}

type failedEvent struct {
	Event   string `json:"event"` // failed
	Message string `json:"message"`
}

// emit writes one line.
func emit(s streams, v any) error {
	b, err := json.Marshal(v)
	if err != nil {
		return err
	}
	_, err = fmt.Fprintln(s.out, string(b))
	return err
}

// emitAll writes the lines of a run that came to its end.
func (j *job) emitAll(s streams) error {
	if err := emit(s, startEvent{"start", version, j.verb, j.dir}); err != nil {
		return err
	}
	for _, g := range j.sv.Guesses {
		if err := emit(s, filesEvent{"files", g.Files, g.Text, g.First}); err != nil {
			return err
		}
	}
	for _, f := range j.news() {
		if f.Severity < eem.Doubt {
			continue
		}
		if err := emit(s, findingEvent{"finding", f.Severity.String(), f.Test, f.ID, f.Batch, f.Component, f.Method,
			orNull(f.Value), orNull(f.Limit), f.Msg, f.File, f.Line}); err != nil {
			return err
		}
	}
	return emit(s, doneEvent{"done", j.out, j.status()})
}

// orNull is nil where there is no number: JSON knows no NaN.
func orNull(v float64) *float64 {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return nil
	}
	return &v
}
