package figure

import (
	"bytes"
	"compress/zlib"
	"encoding/binary"
	"hash/crc32"
	"io"
	"math"
	"runtime"
	"sync/atomic"
)

// Pixels is how many pixels of a PNG stand for a point, across and down: two, enough for
// print and for fine screens; fewer in a figure that is large itself, which gets as many
// as an ordinary screen has, as long as its letters can be read at half the size.
func Pixels(f *Figure) float64 {
	const (
		fine, least = 2, 1.25
		screen      = 1920 * 1080 // pixels
	)
	return max(least, min(fine, math.Sqrt(screen/(f.Width*f.Height))))
}

// WritePNG writes the figure as PNG (ISO/IEC 15948) in the light scheme, so many Pixels a
// point. The file is put together here, and not by image/png, since that wants all
// pixels and the whole palette before it begins: strips are drawn side by side while
// those above them are compressed, and never stand in memory together. The same figure
// gives the same bytes.
func WritePNG(w io.Writer, f *Figure) error {
	scale := Pixels(f)
	width, height := int(math.Round(f.Width*scale)), int(math.Round(f.Height*scale))
	var packed bytes.Buffer // a buffer takes all that is written
	compress, err := zlib.NewWriterLevel(&packed, zlib.BestSpeed)
	if err != nil {
		return err
	}
	whole := newPalette()
	inStrips(f, scale, width, height, func(rows []uint8, p *palette) {
		rename(rows, whole.join(p))
		if err == nil {
			_, err = compress.Write(rows)
		}
	})
	if err == nil {
		err = compress.Close()
	}
	if err != nil {
		return err
	}
	return writeChunks(w, width, height, whole, packed.Bytes())
}

// inStrips draws the figure and hands on its strips from above, from the calling
// goroutine: rows of pixels by their place in a palette, each row behind a 0, the PNG's
// word for pixels as they are. Rows are good until take returns.
func inStrips(f *Figure, scale float64, width, height int, take func(rows []uint8, p *palette)) {
	type drawn struct {
		rows []uint8
		p    *palette
	}
	strips := (height + strip - 1) / strip
	workers := min(strips, runtime.GOMAXPROCS(0))
	ready := make([]chan drawn, strips)
	for k := range ready {
		ready[k] = make(chan drawn, 1)
	}
	// As many strips may wait as are drawn. Who has room takes the next strip, so the one
	// that is waited for has it.
	room := make(chan []uint8, workers+1)
	for range cap(room) {
		room <- make([]uint8, strip*(1+width))
	}
	var taken atomic.Int64
	for range workers {
		go func() {
			c := newCanvas(width, scale)
			for rows := range room {
				k := int(taken.Add(1)) - 1
				if k >= strips {
					return
				}
				c.draw(f, k*strip)
				p := newPalette()
				rows = rows[:min(strip, height-k*strip)*(1+width)]
				for i := 0; i*(1+width) < len(rows); i++ {
					p.index(rows[i*(1+width)+1:(i+1)*(1+width)], c.img.Pix[i*c.img.Stride:])
				}
				ready[k] <- drawn{rows, p}
			}
		}()
	}
	for k := range ready {
		d := <-ready[k]
		take(d.rows, d.p)
		room <- d.rows[:cap(d.rows)]
	}
	close(room)
}

// writeChunks writes the file: its signature, and its chunks, each with its length before
// it and its sum behind.
func writeChunks(w io.Writer, width, height int, p *palette, pixels []byte) error {
	const (
		depth   = 8 // bits a pixel
		indexed = 3 // the colour type of pixels that name a place in a palette
	)
	head := binary.BigEndian.AppendUint32(nil, uint32(width))
	head = binary.BigEndian.AppendUint32(head, uint32(height))
	head = append(head, depth, indexed, 0, 0, 0) // deflate, filters by row, not interlaced
	var colours []byte
	for _, c := range p.colours {
		colours = append(colours, c.R, c.G, c.B)
	}
	if _, err := io.WriteString(w, "\x89PNG\r\n\x1a\n"); err != nil {
		return err
	}
	for _, chunk := range []struct {
		name string
		data []byte
	}{{"IHDR", head}, {"PLTE", colours}, {"IDAT", pixels}, {"IEND", nil}} {
		name := []byte(chunk.name)
		sum := crc32.Update(crc32.ChecksumIEEE(name), crc32.IEEETable, chunk.data)
		for _, part := range [][]byte{
			binary.BigEndian.AppendUint32(nil, uint32(len(chunk.data))), name, chunk.data, binary.BigEndian.AppendUint32(nil, sum),
		} {
			if _, err := w.Write(part); err != nil {
				return err
			}
		}
	}
	return nil
}
