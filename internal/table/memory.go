package table

import (
	"os"
	"strconv"
	"strings"
	"sync"
)

// EstimateRead gives the bytes that Read is expected to hold for a table of size bytes of plain text with rows of
// rowBytes bytes on average: the text, an offset of four bytes a row and the blocks in flight.
func EstimateRead(size int64, rowBytes float64) int64 {
	return size + int64(4*float64(size)/max(rowBytes, 1)) + min(size, 4*blockSize)
}

// EstimateNumbers gives the bytes of a rows x cols matrix of float64.
func EstimateNumbers(rows, cols int) int64 { return int64(rows) * int64(cols) * 8 }

// DefaultMemory is the memory cap where none is given: three quarters of what the machine, or the control group the
// process runs in, has to give; 4 GiB where neither says.
var DefaultMemory = sync.OnceValue(func() int64 {
	have := int64(0)
	if text, err := os.ReadFile("/proc/meminfo"); err == nil {
		for line := range strings.Lines(string(text)) {
			if f := strings.Fields(line); len(f) >= 2 && f[0] == "MemAvailable:" {
				if kib, err := strconv.ParseInt(f[1], 10, 64); err == nil {
					have = kib << 10
				}
			}
		}
	}
	for _, path := range []string{"/sys/fs/cgroup/memory.max", "/sys/fs/cgroup/memory/memory.limit_in_bytes"} {
		if text, err := os.ReadFile(path); err == nil {
			if limit, err := strconv.ParseInt(strings.TrimSpace(string(text)), 10, 64); err == nil && limit > 0 && (have == 0 || limit < have) {
				have = limit
			}
		}
	}
	if have == 0 {
		have = 16 << 30 / 3
	}
	return have / 4 * 3
})
