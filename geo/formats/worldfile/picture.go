package worldfile

import (
	"errors"
	"fmt"
	"image"
	"image/jpeg"
	"image/png"
	"io"

	"golang.org/x/image/tiff"

	"groundtally/geo/formats"
	"groundtally/geo/formats/geotiff"
)

// Options say what is read. A limit of zero is the default.
type Options struct {
	File      string
	MaxPixels int // 64,000,000; a pixel takes 1 to 8 bytes
}

// Info is what the head of a picture says.
type Info struct {
	Format        string // "PNG", "JPEG", "TIFF"
	Width, Height int    // in pixels
	World         World  // where the picture itself says it; a TIFF may
	Placed        bool   // World is set
	CRS           string // "EPSG:25832" where the picture itself says it
}

const doPNG = "save it again as PNG, with a world file"

// mostPixelsPerByte is the most that a byte of a file can stand for: eight pixels of one bit in each byte
// of a PNG, packed 1,032 to 1. JPEG packs less.
const mostPixelsPerByte = 8 * 1032

// Look reads the head of a picture of size bytes.
func Look(r io.ReaderAt, size int64, o Options) (Info, error) {
	in, err := look(r, size, o)
	return in, named(err, o.File)
}

// Picture reads a picture of size bytes. No memory is taken for pixels beyond the limit of o, nor for more
// than the file can hold.
func Picture(r io.ReaderAt, size int64, o Options) (image.Image, error) {
	in, err := look(r, size, o)
	if err != nil {
		return nil, named(err, o.File)
	}
	var img image.Image
	s := io.NewSectionReader(r, 0, size)
	switch in.Format {
	case "PNG":
		img, err = png.Decode(s)
	case "JPEG":
		img, err = jpeg.Decode(s)
	default:
		img, err = tiff.Decode(s)
	}
	if err == nil && (img.Bounds().Dx() != in.Width || img.Bounds().Dy() != in.Height) {
		err = fmt.Errorf("%d by %d pixels came out", img.Bounds().Dx(), img.Bounds().Dy())
	}
	if err != nil {
		return nil, named(damaged(in.Format, err), o.File)
	}
	return img, nil
}

func named(err error, file string) error {
	var e *formats.Error
	if errors.As(err, &e) {
		e.File = file
	}
	return err
}

func damaged(format string, err error) error {
	e := &formats.Error{Code: "damaged", What: "the " + format + " picture cannot be read", Do: "copy it again, or " + doPNG, Err: err}
	if errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) {
		e.Code, e.What, e.Err, e.Do = "truncated", "the "+format+" picture ends early", nil, "copy or download it again"
	}
	return e
}

func look(r io.ReaderAt, size int64, o Options) (Info, error) {
	if o.MaxPixels <= 0 {
		o.MaxPixels = 64_000_000
	}
	head := make([]byte, 8)
	n, err := r.ReadAt(head, 0)
	if n < len(head) && err != nil && !errors.Is(err, io.EOF) {
		return Info{}, &formats.Error{Code: "unreadable", What: "the picture cannot be read", Err: err}
	}
	in := Info{}
	var c image.Config
	s := io.NewSectionReader(r, 0, size)
	switch {
	case string(head) == "\x89PNG\r\n\x1a\n":
		in.Format = "PNG"
		c, err = png.DecodeConfig(s)
	case string(head[:3]) == "\xff\xd8\xff":
		in.Format = "JPEG"
		c, err = jpeg.DecodeConfig(s)
	case string(head[:2]) == "II" || string(head[:2]) == "MM":
		in.Format = "TIFF"
		c, err = in.lookTIFF(r, size)
		var e *formats.Error
		if errors.As(err, &e) {
			return Info{}, err
		}
	default:
		return Info{}, &formats.Error{Code: "not_a_picture", What: "the file is not a PNG, JPEG or TIFF picture", Do: doPNG}
	}
	if err != nil {
		return Info{}, damaged(in.Format, err)
	}
	in.Width, in.Height = c.Width, c.Height
	pixels := int64(c.Width) * int64(c.Height)
	switch {
	case pixels <= 0:
		return Info{}, damaged(in.Format, errors.New("it has no pixels"))
	case pixels > int64(o.MaxPixels):
		return Info{}, &formats.Error{Code: "too_many", What: fmt.Sprintf("the picture has %d by %d pixels, at most %d can be read", c.Width, c.Height, o.MaxPixels), Do: "cut it to the district or save it smaller"}
	case pixels > mostPixelsPerByte*size:
		return Info{}, damaged(in.Format, fmt.Errorf("%d bytes cannot hold %d by %d pixels", size, c.Width, c.Height))
	}
	return in, nil
}

// lookTIFF reads the head of a TIFF, and refuses what the decoder would not read or not read rightly.
func (in *Info) lookTIFF(r io.ReaderAt, size int64) (image.Config, error) {
	h, err := geotiff.Info(r, size, geotiff.Options{})
	if err != nil {
		return image.Config{}, err
	}
	refuse := func(what string) error {
		return &formats.Error{Code: "picture_form", What: what, Do: doPNG}
	}
	switch {
	case h.Kind == geotiff.Values && (h.Sample != "Byte" || h.Bands != 1):
		err = refuse(fmt.Sprintf("the file holds values (%s, bands: %d), not a picture", h.Sample, h.Bands))
	case h.Sample != "Byte":
		err = refuse("the colours have another depth than 8 bits: " + h.Sample)
	case h.Big:
		err = refuse("it is a big TIFF file, which is not read as a picture")
	case h.Planar:
		err = refuse("the colours lie apart in planes")
	case h.Compression != "none" && h.Compression != "LZW" && h.Compression != "Deflate" && h.Compression != "PackBits":
		err = refuse(h.Compression + " compression is not read in a TIFF picture")
	}
	if err != nil {
		return image.Config{}, err
	}
	if in.CRS = h.CRS; h.Placed {
		t := h.Transform
		in.World = World{A: t[1], D: t[4], B: t[2], E: t[5], C: t[0] + (t[1]+t[2])/2, F: t[3] + (t[4]+t[5])/2}
		in.Placed = true
	}
	c, err := tiff.DecodeConfig(io.NewSectionReader(r, 0, size))
	var unsupported tiff.UnsupportedError
	if errors.As(err, &unsupported) {
		e := &formats.Error{Code: "picture_form", What: "this form of TIFF picture is not read", Do: doPNG, Err: err}
		return c, e
	}
	if err == nil && (c.Width != h.Cols || c.Height != h.Rows) {
		return c, refuse("the first image in the file is not the one in full size")
	}
	return c, err
}
