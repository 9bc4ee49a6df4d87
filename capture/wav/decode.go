package wav

import "math"

// kernel converts len(dst) samples of one channel to fractions of full scale.
// Byte k of the file's block is src[headroom+k]; the channel's first sample
// begins at byte off of the block, the others follow every stride bytes.
//
// Integer kernels place the container at the top of an int32 and scale by
// 2^-31, which is c / 2^(container bits - 1). A float64 holds each of these
// values exactly, so nothing is rounded.
type kernel func(dst []float64, src []byte, off, stride int)

const scale31 = 0x1p-31

// unsigned8 reads codes 0..255 with 128 as zero.
func unsigned8(dst []float64, src []byte, off, stride int) {
	off += headroom
	for i := range dst {
		dst[i] = float64(int(src[off])-128) * 0x1p-7
		off += stride
	}
}

func int16s(dst []float64, src []byte, off, stride int) {
	off += headroom
	for i := range dst {
		dst[i] = float64(int16(le.Uint16(src[off:off+2]))) * 0x1p-15
		off += stride
	}
}

// int24s loads the word that begins one byte before the sample and clears that
// byte: one load and one bounds check a sample instead of three.
func int24s(dst []float64, src []byte, off, stride int) {
	for i := range dst {
		dst[i] = float64(int32(le.Uint32(src[off:off+4])&^0xFF)) * scale31
		off += stride
	}
}

// int24stereo is int24s for both channels of a two-channel file, the commonest
// recording of all, with one load a frame: a third faster. src goes on for
// tailroom bytes after the last frame.
func int24stereo(left, right []float64, src []byte) {
	right = right[:len(left)]
	off := 0
	for i := range left {
		u := le.Uint64(src[off : off+8]) // byte before, 3 left, 3 right, byte after
		left[i] = float64(int32(uint32(u)&^0xFF)) * scale31
		right[i] = float64(int32(uint32(u>>24)&^0xFF)) * scale31
		off += 6
	}
}

func int32s(dst []float64, src []byte, off, stride int) {
	off += headroom
	for i := range dst {
		dst[i] = float64(int32(le.Uint32(src[off:off+4]))) * scale31
		off += stride
	}
}

// An exponent field of all ones marks infinities and NaN.
const (
	exponent32 = 0x7F80_0000
	exponent64 = 0x7FF0_0000_0000_0000
)

// float32s gives NaN for every sample that is not finite: x - x is 0 for
// finite x, else NaN.
func float32s(dst []float64, src []byte, off, stride int) {
	off += headroom
	for i := range dst {
		x := float64(math.Float32frombits(le.Uint32(src[off : off+4])))
		dst[i] = x + (x - x)
		off += stride
	}
}

// float64s gives NaN for every sample that is not finite, as float32s does.
func float64s(dst []float64, src []byte, off, stride int) {
	off += headroom
	for i := range dst {
		x := math.Float64frombits(le.Uint64(src[off : off+8]))
		dst[i] = x + (x - x)
		off += stride
	}
}
