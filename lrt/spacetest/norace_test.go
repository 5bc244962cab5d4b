//go:build !race

package spacetest

const raceEnabled = false
