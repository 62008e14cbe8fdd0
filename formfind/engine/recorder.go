package engine

import "time"

// Recorder keeps the course of an iteration, so that methods can be compared.
type Recorder struct {
	Rows  []Row
	start time.Time
}

// Row is one iteration.
type Row struct {
	Engine    string
	Stage     string
	Iteration int
	Seconds   float64 // since the first row
	Residual  float64
	Energy    float64 // potential or kinetic, by engine; 0 = not computed
}

// Record appends one iteration; it does nothing on a nil Recorder.
func (r *Recorder) Record(row Row) {
	if r == nil {
		return
	}
	if r.start.IsZero() {
		r.start = time.Now()
	}
	row.Seconds = time.Since(r.start).Seconds()
	r.Rows = append(r.Rows, row)
}
