//go:build soak

package run

import (
	"os"
	"runtime"
	"testing"
	"time"
)

// TestSoakEditsAndUndos works on studies by chance for GROUNDTALLY_SOAK_TIME. Stored results must equal a
// fresh run all the time, and memory may not grow from one study to the next.
func TestSoakEditsAndUndos(t *testing.T) {
	long, err := time.ParseDuration(os.Getenv("GROUNDTALLY_SOAK_TIME"))
	if err != nil {
		t.Fatalf("GROUNDTALLY_SOAK_TIME: %v", err)
	}
	const stepsEach = 60
	end := time.Now().Add(long)
	var heap []uint64
	checks := 0
	for seed := uint64(1); time.Now().Before(end); seed++ {
		checks += editsAndUndos(t, smallStudy(t, 60), seed, func(step int) bool { return step < stepsEach && time.Now().Before(end) })
		runtime.GC()
		var m runtime.MemStats
		runtime.ReadMemStats(&m)
		heap = append(heap, m.HeapAlloc>>20)
		t.Logf("study %d: %d states compared, %d MB in use", seed, checks, m.HeapAlloc>>20)
	}
	if checks == 0 {
		t.Fatal("no state was compared: the time is too short")
	}
	if n := len(heap); n > 2 && heap[n-1] > heap[1]+heap[1]/2+32 {
		t.Errorf("memory in use grew from %d MB to %d MB over %d studies", heap[1], heap[n-1], n)
	}
}
