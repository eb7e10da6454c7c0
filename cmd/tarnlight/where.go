package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
)

// isResults says whether a folder holds results.
func isResults(dir string) bool {
	_, err := os.Stat(filepath.Join(dir, "provenance.json"))
	return err == nil
}

// resultsFolder says what is wrong with a folder that should hold results, and
// which one was meant.
func resultsFolder(dir string) error {
	info, err := os.Stat(dir)
	switch {
	case err != nil:
		return nil // what an interrupted run left is for others to tell
	case !info.IsDir():
		return fmt.Errorf("%s is a file; give the folder of results that it lies in", dir)
	case isResults(dir):
		return nil
	case isResults(filepath.Join(dir, "out")):
		return fmt.Errorf("%s is no folder of results; did you mean %s?", dir, filepath.Join(dir, "out"))
	}
	return fmt.Errorf("%s holds no results (no provenance.json); give the out folder of a survey that was run", dir)
}

// surveyFolder says what is wrong with a folder that should be a survey.
func surveyFolder(dir string) error {
	info, err := os.Stat(dir)
	switch {
	case err != nil:
		return fmt.Errorf("%s: no such survey folder; a survey is a folder with a runsheet.csv or runsheet.xlsx (tarnlight begin drafts one)", dir)
	case !info.IsDir():
		return fmt.Errorf("%s is a file; give the survey folder that it lies in", dir)
	case isResults(dir):
		return fmt.Errorf("%s holds results, not a survey; the survey is the folder above", dir)
	}
	return nil
}

// meant finds the id that somebody wrote in another case.
func meant(id string, ids []string) string {
	for _, x := range ids {
		if strings.EqualFold(x, id) {
			return fmt.Sprintf("did you mean %s?", x)
		}
	}
	return "it has " + some(ids)
}

func isFolder(path string) bool {
	info, err := os.Stat(path)
	return err == nil && info.IsDir()
}
