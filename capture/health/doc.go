// Package health reads a recording once, from end to end, and says what its
// samples alone give away: the levels of every channel, and the faults that
// no header tells of.
//
//	clipped             3 samples in a row at full scale (channel.go)
//	flat-top            a sine that stands still below full scale (flat.go)
//	few-codes           a tone of few converter steps (flat.go)
//	repeated-block      a block of samples that came before (repeats.go)
//	gap                 zeros inside a signal (gap.go)
//	silent              all samples equal (channel.go)
//	identical-channels  a channel that copies another (twins.go)
//
// The samples are read in blocks, so that memory does not grow with the
// recording: about 0.4 MB a channel. Whatever is summed is summed in cells of
// 4096 frames that start at frame 0, and cells are joined in order: the result
// does not depend on the size of the blocks. Places that look suspicious are
// read once more, a bounded stretch each.
//
// Thresholds stand beside the code that applies them. The rule above them
// all: a clean recording carries no flag. What cannot be told from a healthy
// signal is not flagged.
package health
