package wav

import (
	"fmt"

	"benchslip/capture/recording"
)

// MaxChannels is the largest number of channels read or written.
const MaxChannels = 64

// encoding is how one sample lies in the file.
type encoding struct {
	channels int
	rate     uint32 // frames a second
	bytes    int    // of the container of one sample
	valid    int    // valid bits; for integers at the top of the container
	float    bool
	convert  kernel
}

func (e encoding) frameBytes() int { return e.channels * e.bytes }

// words names the encoding for people: "24-bit PCM", "32-bit float".
func (e encoding) words() string {
	switch {
	case e.float:
		return fmt.Sprintf("%d-bit float", 8*e.bytes)
	case e.valid != 8*e.bytes:
		return fmt.Sprintf("%d-bit PCM in %d bits", e.valid, 8*e.bytes)
	}
	return fmt.Sprintf("%d-bit PCM", e.valid)
}

// Codec numbers that are read (RFC 2361), and the one that says "see the
// sub-format".
const (
	tagPCM        = 0x0001
	tagFloat      = 0x0003
	tagExtensible = 0xFFFE
)

// refused names codec numbers that are met in practice and not read (RFC
// 2361). Only those names are given that describe a coding, not a maker.
var refused = map[uint16]string{
	0x0002: "ADPCM",
	0x0006: "A-law",
	0x0007: "mu-law",
	0x0010: "ADPCM",
	0x0011: "IMA ADPCM",
	0x0014: "G.723 ADPCM",
	0x0031: "GSM 6.10",
	0x0040: "G.721 ADPCM",
	0x0050: "MPEG audio",
	0x0055: "MPEG layer 3 audio",
	0x0064: "G.726 ADPCM",
	0x0065: "G.722 ADPCM",
	0x0092: "coded digital interface audio",
	0x00FF: "AAC",
	0x1610: "AAC",
	0x2000: "AC-3",
	0xF1AC: "lossless coded audio",
}

// subFormatTail ends every sub-format identifier that begins with a codec
// number: 0000-0010-8000-00AA00389B71 as stored.
const subFormatTail = "\x00\x00\x00\x00\x10\x00\x80\x00\x00\xAA\x00\x38\x9B\x71"

// soundFieldTail ends the sub-formats whose channels are the components of a
// sound field: 0000-0721-11D3-8644-C8C1CA000000 as stored.
const soundFieldTail = "\x00\x00\x21\x07\xD3\x11\x86\x44\xC8\xC1\xCA\x00\x00\x00"

// parseFormat reads the body of a fmt chunk that lies at byte at. Layout,
// little endian: codec 2 bytes, channels 2, frames a second 4, bytes a second
// 4 (not used: often wrong, always implied), bytes a frame 2, bits a sample 2;
// extensible: length of the rest 2, valid bits 2, speaker mask 4 (not used),
// sub-format 16. A longer body is legal.
func parseFormat(b []byte, at int64, path string) (encoding, error) {
	fail := func(off int64, class error, fix, format string, args ...any) (encoding, error) {
		return encoding{}, &recording.Error{Path: path, Offset: at + off, Class: class,
			What: fmt.Sprintf(format, args...), Fix: fix}
	}
	if len(b) < 16 {
		return fail(0, recording.ErrFormat, "", "the fmt chunk has %d bytes, at least 16 are needed", len(b))
	}
	tag := le.Uint16(b)
	channels, rate := int(le.Uint16(b[2:])), le.Uint32(b[4:])
	frame, bits := int(le.Uint16(b[12:])), int(le.Uint16(b[14:]))
	valid, sub := bits, tag
	if tag == tagExtensible {
		if len(b) < 40 {
			return fail(0, recording.ErrFormat, "", "the extensible fmt chunk has %d bytes, at least 40 are needed", len(b))
		}
		switch sub = le.Uint16(b[24:]); string(b[26:40]) {
		case subFormatTail:
		case soundFieldTail:
			return fail(24, recording.ErrUnsupported, "save the channels as plain PCM",
				"sound-field (B-format) sub-format")
		default:
			return fail(24, recording.ErrUnsupported, "", "unknown sub-format %x", b[24:40])
		}
		if v := int(le.Uint16(b[18:])); v != 0 { // 0: some writers leave it empty
			valid = v
		}
	}
	if sub != tagPCM && sub != tagFloat {
		name, known := refused[sub]
		if !known {
			name = "unknown codec"
		}
		return fail(0, recording.ErrUnsupported, "save it as PCM", "%s (tag %d)", name, sub)
	}

	e := encoding{channels: channels, rate: rate, bytes: (bits + 7) / 8, valid: valid, float: sub == tagFloat}
	switch {
	case channels == 0:
		return fail(2, recording.ErrFormat, "", "0 channels")
	case channels > MaxChannels:
		return fail(2, recording.ErrUnsupported, "split it", "%d channels, up to %d are read", channels, MaxChannels)
	case rate == 0:
		return fail(4, recording.ErrFormat, "", "a sample rate of 0 Hz")
	case bits == 0:
		return fail(14, recording.ErrFormat, "", "0 bits a sample")
	case frame%channels != 0 || frame < channels*e.bytes:
		return fail(12, recording.ErrFormat, "", "%d bytes a frame cannot hold %d channels of %d bits", frame, channels, bits)
	case frame != channels*e.bytes:
		// Wider than the width asks for: whether the bits lie at the top or
		// the bottom of the container is nowhere defined.
		return fail(12, recording.ErrUnsupported, "save it as extensible or as plain packed PCM",
			"%d-bit samples in %d bytes each, whose position in them is not defined", bits, frame/channels)
	case tag == tagExtensible && bits%8 != 0:
		return fail(14, recording.ErrFormat, "", "an extensible container of %d bits, wanted whole bytes", bits)
	case valid > 8*e.bytes:
		return fail(18, recording.ErrFormat, "", "%d valid bits in a container of %d", valid, 8*e.bytes)
	}

	kernels := map[int]kernel{1: unsigned8, 2: int16s, 3: int24s, 4: int32s}
	if e.float {
		kernels = map[int]kernel{4: float32s, 8: float64s}
	}
	e.convert = kernels[e.bytes]
	switch {
	case e.convert == nil || e.float && bits%32 != 0:
		return fail(14, recording.ErrUnsupported, "save it as 24-bit PCM or 32-bit float", "%s", e.words())
	case !e.float && e.valid < 2:
		return fail(14, recording.ErrUnsupported, "", "%d-bit PCM", e.valid)
	}
	if e.float {
		e.valid = 8 * e.bytes
	}
	return e, nil
}
