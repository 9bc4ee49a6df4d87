// Package stimulus describes, makes and recognises the signals that are
// played into a unit under test.
//
// A stimulus is one line of text, its kind and its keys:
//
//	sweep from=20Hz to=20kHz length=10s peak=-10dBFS
//
// The same line stands in a job file, on the command line and, complete with
// every default, in the file that is written (LIST/INFO comment), where
// FromInfo finds it again. Parse makes it a Spec; New makes the samples;
// Steps, Sweep, Tones and Pulses say when what is heard, which is what an
// analyser aligns a recording to.
//
// Every kind keeps the same frame: silence (before), the signal at its full
// level (length), silence (after). Fades lie outside the length, so within it
// the level is exactly the one stated. Times are rounded to whole samples of
// the stimulus' own rate. The same description gives the same samples.
//
// Levels in dBFS are those of a sine whose peak lies at that fraction of
// digital full scale; for other signals peak= is the largest |sample| in the
// same measure, 20 lg(peak / full scale).
package stimulus

// Caution is for everyone who is about to play a stimulus.
const Caution = "turn the output all the way down before playing, raise it while watching the level, and keep ears, headphones and loudspeakers off the line: " +
	"test signals are loud and steady, and a sweep or noise at full level can destroy a loudspeaker"
