package recording

// Flag codes. The threshold of each stands where it is raised.
const (
	Clipped             = "clipped"              // recorder at full scale: invalidates what reads it
	FlatTop             = "flat-top"             // a flat top below full scale: the unit or a stage before
	Truncated           = "truncated"            // fewer samples than the file promised
	SizeMended          = "size-mended"          // a size field lied and was reconciled with the file
	Overrange           = "overrange"            // cells or samples without a value
	Gap                 = "gap"                  // missing time
	RepeatedBlock       = "repeated-block"       // the same samples twice in a row
	Silent              = "silent"               // every sample equal
	FewCodes            = "few-codes"            // a tone that uses few converter steps
	TimeJitter          = "time-jitter"          // uneven time stamps
	DuplicateTime       = "duplicate-time"       // time stamps that repeat
	RateDoubt           = "rate-doubt"           // sources of the rate disagree, or a clock is over 500 ppm off
	IdenticalChannels   = "identical-channels"   // two channels hold the same samples
	ResampledLooking    = "resampled-looking"    // a wall in the spectrum: rate conversion or a lossy path
	GainRiding          = "gain-riding"          // something changes the gain during the take
	Settling            = "settling"             // the take starts before things came to rest
	MainsUnlike         = "mains-unlike"         // the mains found is not the job's
	NearFloor           = "near-floor"           // 3..6 dB above the instrument's own floor
	TonePresent         = "tone-present"         // a tone in what should be noise
	ToneOnMains         = "tone-on-mains"        // the test tone sits on a mains line
	UncertaintyUnstated = "uncertainty-unstated" // a needed uncertainty was not stated
	Uncalibrated        = "uncalibrated"         // no volts at full scale
	Ratio               = "ratio"                // the two test tones are not in the expected ratio
	NoBaseline          = "no-baseline"          // pick-up without its baseline
	StaleCalibration    = "stale-calibration"    // gear calibration old or made at another rate or mode
	Averaged            = "averaged"             // a scope's averaging mode
	PeakDetect          = "peak-detect"          // a scope's peak-detect mode
)
