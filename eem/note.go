package eem

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// Severity is the one ladder on which everything that is said about a number
// stands.
type Severity uint8

// The ladder. Information is the plain record of a step and belongs to no test;
// Remark ("note" in the results) tells something that needs no action; Doubt
// travels with the number and must be seen; Reject makes the number unusable.
const (
	Information Severity = iota
	Remark
	Doubt
	Reject
)

// String gives the word written to the results.
func (s Severity) String() string {
	return [...]string{"information", "note", "doubt", "reject"}[min(s, Reject)]
}

// Param is one parameter of a step, for steps.csv.
type Param struct {
	Name, Value, Unit string
	Source            string // where the value comes from: a setting, a file, a published source
}

// Note is what a step did to a value or a test found in it.
type Note struct {
	Step     string // "inner filter", "blank", …; see Steps in eem/prepare for the order
	Params   []Param
	Test     string // code of the test that raised it; empty for the plain record of a step
	Severity Severity
	Value    float64 // what was found, and
	Limit    float64 // what it was held against; both are 0 unless Measure is set
	Measure  bool    // Value and Limit mean something
	Msg      string  // in words, with the remedy
	File     string
	Line     int
}

// Flag is one row of flags.csv: a note that a test raised, with whom it concerns.
type Flag struct {
	ID, Batch, Component, Method string // empty where it concerns all
	Test                         string // a code of Tests
	Severity                     Severity
	Value, Limit                 float64 // NaN where there is none
	Msg                          string
	File                         string
	Line                         int
}

// NewFlag returns f. It panics when its code is not on the list of Tests: no code is
// ever written that a user cannot look up. Every Flag comes from here or from
// FlagFrom; a test of the sources holds them to it.
func NewFlag(f Flag) Flag {
	if _, ok := FindTest(f.Test); !ok {
		panic(fmt.Sprintf("eem: test code %q is not on the list", f.Test))
	}
	return f
}

// FlagFrom makes a flag of a note that a test raised. It panics like NewFlag.
func FlagFrom(n Note, id, batch string) Flag {
	f := NewFlag(Flag{ID: id, Batch: batch, Test: n.Test, Severity: n.Severity, Value: math.NaN(), Limit: math.NaN(),
		Msg: n.Msg, File: n.File, Line: n.Line})
	if n.Measure {
		f.Value, f.Limit = n.Value, n.Limit
	}
	return f
}

// Scope says which values share one error of a Cause.
type Scope uint8

// Scopes of a cause, widest first.
const (
	OfSurvey Scope = iota
	OfBatch
	OfStandard
	OfBottle
)

// Cause is one source of error that many cells share: one unknown factor, with
// standard uncertainty U, acting on all of them at once.
type Cause struct {
	Name  string // "intensity scale", "inner filter", …
	Scope Scope
	Key   string  // which batch, bottle or standard; empty for the survey
	U     float64 // relative standard uncertainty when Shape is nil; NaN: it acts and nobody stated its size
	// Shape, J × K in the unit of the EEM, is the change of every cell when the
	// cause is off by one standard uncertainty; nil means (U + Ex[j] + Em[k])·F.
	Shape []float64
	// Ex, J, and Em, K, are the parts of the relative change that go with the
	// wavelengths; nil means none.
	Ex, Em []float64
	Apart  bool // Ex and Em are no one error but one for each wavelength

	DF     float64 // degrees of freedom of U; 0 means known without any
	Source string  // where the figure comes from, in words
}

// Count writes a number of things: "1 sample", "2 samples".
func Count(n int, thing string) string {
	if n == 1 || n == -1 {
		return fmt.Sprintf("%d %s", n, thing)
	}
	return fmt.Sprintf("%d %ss", n, thing)
}

// NM writes a wavelength for a message, to 0.01 nm at most: no fluorometer is better.
func NM(nm float64) string { return strconv.FormatFloat(math.Round(100*nm)/100, 'f', -1, 64) }

// Spot writes a place of the plane for a message: "ex 275 / em 340 nm".
func Spot(exNM, emNM float64) string { return "ex " + NM(exNM) + " / em " + NM(emNM) + " nm" }

// InDetail parts a message into the words for everyone and the figures behind them.
const InDetail = "; in detail: "

// Brief is a message without its detail.
func Brief(msg string) string {
	brief, _, _ := strings.Cut(msg, InDetail)
	return brief
}
