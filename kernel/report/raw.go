package report

import (
	"encoding/base64"
	"encoding/xml"
	"io"
	"net/url"
	"os"
	"path"
	"path/filepath"
	"regexp"
	"strings"

	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/renderer"
	"github.com/yuin/goldmark/util"

	"brinkline/kernel/notebook"
)

// rawRenderer renders what a page can't take over as it stands: pictures, which
// must be in the page itself, and HTML within prose.
type rawRenderer struct {
	folder string         // of the notebook; pictures in it are taken into the page
	cell   *notebook.Cell // whose prose it is; it may have pictures attached
	escape bool           // show all HTML as text
}

// RegisterFuncs implements renderer.NodeRenderer.
func (r *rawRenderer) RegisterFuncs(reg renderer.NodeRendererFuncRegisterer) {
	reg.Register(ast.KindImage, r.image)
	reg.Register(ast.KindRawHTML, r.inlineHTML)
	reg.Register(ast.KindHTMLBlock, r.blockHTML)
	reg.Register(kindMath, renderMath)
	reg.Register(kindMathBlock, renderMathBlock)
}

func (r *rawRenderer) image(w util.BufWriter, source []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	if !entering {
		return ast.WalkContinue, nil
	}
	alt, destination := plainText(node, source), string(node.(*ast.Image).Destination)
	if data, ok := r.pictureData(destination); ok {
		_, _ = w.WriteString(`<img src="` + escaped(data) + `" alt="` + escaped(alt) + `" />`)
		return ast.WalkSkipChildren, nil
	}
	_, _ = w.WriteString(`<span class="absent">[picture not in this page: ` + escaped(strings.TrimSpace(alt+" "+destination)) + `]</span>`)
	return ast.WalkSkipChildren, nil
}

var (
	pictureTypes = map[string]string{
		".png": "image/png", ".jpg": "image/jpeg", ".jpeg": "image/jpeg", ".gif": "image/gif", ".webp": "image/webp", ".svg": "image/svg+xml",
	}
	dataPicture = regexp.MustCompile(`^data:image/(png|jpeg|gif|webp|svg\+xml);base64,[A-Za-z0-9+/=]+$`)
)

// maxPicture bounds a picture file, so that a page stays one that can be mailed.
const maxPicture = 1 << 20

// pictureData returns a picture as a data URL: one that is such already, an
// attachment of the cell, or a file in the notebook's folder.
func (r *rawRenderer) pictureData(destination string) (string, bool) {
	if dataPicture.MatchString(destination) {
		return destination, true
	}
	name, err := url.PathUnescape(destination)
	if err != nil {
		return "", false
	}
	if attached, ok := strings.CutPrefix(name, "attachment:"); ok && r.cell != nil {
		mime, content, ok := r.cell.Attachment(attached)
		data := "data:" + mime + ";base64," + strings.Join(strings.Fields(content), "")
		return data, ok && dataPicture.MatchString(data)
	}
	mime, ok := pictureTypes[strings.ToLower(path.Ext(name))]
	if !ok {
		return "", false
	}
	content, ok := readWithin(r.folder, name)
	return "data:" + mime + ";base64," + base64.StdEncoding.EncodeToString(content), ok
}

// readWithin reads a file in or below a folder, never outside it.
func readWithin(folder, name string) ([]byte, bool) {
	root, err := os.OpenRoot(folder)
	if err != nil {
		return nil, false
	}
	defer root.Close()
	file, err := root.Open(filepath.FromSlash(name))
	if err != nil {
		return nil, false
	}
	defer file.Close()
	content, err := io.ReadAll(io.LimitReader(file, maxPicture+1))
	return content, err == nil && len(content) <= maxPicture
}

// inlineTag matches the tags that prose may hold between its words.
var inlineTag = regexp.MustCompile(`^</?(sub|sup|b|i|u|em|strong|kbd|small|mark|code)>$|^<br ?/?>$`)

func (r *rawRenderer) inlineHTML(w util.BufWriter, source []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	if !entering {
		return ast.WalkSkipChildren, nil
	}
	tag := string(node.(*ast.RawHTML).Segments.Value(source))
	switch {
	case strings.HasPrefix(tag, "<!--"):
	case !inlineTag.MatchString(tag) || r.escape:
		_, _ = w.WriteString(escaped(tag))
	case strings.HasPrefix(tag, "<br"):
		_, _ = w.WriteString("<br />")
	default:
		_, _ = w.WriteString(tag)
	}
	return ast.WalkSkipChildren, nil
}

func (r *rawRenderer) blockHTML(w util.BufWriter, source []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	if !entering {
		return ast.WalkContinue, nil
	}
	block := node.(*ast.HTMLBlock)
	content := string(block.Lines().Value(source))
	if block.HasClosure() {
		content += string(block.ClosureLine.Value(source))
	}
	clean, ok := cleanHTML(content)
	if !ok || r.escape {
		clean = "<pre>" + escaped(printable(content)) + "</pre>\n"
	}
	_, _ = w.WriteString(clean)
	return ast.WalkContinue, nil
}

// wellFormed reports whether all tags of a fragment are closed in order.
func wellFormed(fragment string) bool {
	decoder := xml.NewDecoder(strings.NewReader("<x>" + fragment + "</x>"))
	decoder.Entity = xml.HTMLEntity
	for {
		if _, err := decoder.Token(); err != nil {
			return err == io.EOF
		}
	}
}
