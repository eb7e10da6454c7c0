//go:build !race

package main

const raceFactor = 1
