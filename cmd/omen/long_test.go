//go:build long

package main

import "testing"

func TestLongKilledAndResumed(t *testing.T) { testKills(t, 50) }
