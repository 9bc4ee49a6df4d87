// Package health reads a recording once, from end to end, and says what its
// samples alone give away: the levels of every channel, and the faults that
// no header tells of - a recorder at full scale, a flat top, a dead channel,
// a channel that copies another.
//
// The samples are read in blocks, so that memory does not grow with the
// recording. Whatever is summed is summed in cells of 4096 frames that start
// at frame 0, and cells are joined in order: the result does not depend on
// the size of the blocks.
//
// Thresholds stand beside the code that applies them. The rule above them
// all: a clean recording carries no flag. What cannot be told from a healthy
// signal is not flagged.
package health
