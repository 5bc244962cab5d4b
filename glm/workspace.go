package glm

import (
	"context"
	"sync"

	"subsume.example/internal/linalg"
	"subsume.example/lrt"
)

// workspace is the memory of a comparison of two models that are not joined:
// nothing of it outlives the comparison, so that the next one can use it.
type workspace struct {
	joint  joint
	filler filler
	gram   linalg.Gram
	factor linalg.Factor
	models [2]*Model
	groups []linalg.Group
	all    []int
	views  [2]view
	used   int
}

// workspaces holds idle memory and nothing else: which of them a comparison gets
// cannot be told from its result.
var workspaces = sync.Pool{New: func() any { return new(workspace) }}

// pooledRows is the number of rows up to which memory is reused.
const pooledRows = linalg.BlockRows

// pairAlone fits a comparison of two models on a factorization of their own.
func pairAlone(ctx context.Context, c lrt.Comparison, s, b *Model) (lrt.Pair, error) {
	src, ok := s.src.(Sliced)
	if !ok || src.Len() > pooledRows {
		j, err := newJoint(ctx, []*Model{s, b}, true)
		if err != nil {
			return lrt.Pair{}, err
		}
		return j.pair(c)
	}
	ws := workspaces.Get().(*workspace)
	defer ws.release()
	ws.models = [2]*Model{s, b}
	ws.joint.ws = ws
	if err := ws.joint.init(ctx, ws.models[:], true); err != nil {
		return lrt.Pair{}, err
	}
	return ws.joint.pair(c)
}

// release forgets what the memory was used for.
func (ws *workspace) release() {
	ws.models = [2]*Model{}
	clear(ws.joint.cols)
	ws.joint = joint{cols: ws.joint.cols[:0], basis: basis{shift: ws.joint.shift[:0], exp: ws.joint.exp[:0]}}
	ws.filler.forget()
	ws.factor.Forget()
	for i := range ws.views {
		ws.views[i] = view{groups: ws.views[i].groups[:0]}
	}
	ws.used = 0
	workspaces.Put(ws)
}

// forget drops what a filler shows of a source.
func (f *filler) forget() {
	clear(f.part.Hi)
	clear(f.part.Lo)
	clear(f.part.Index)
	clear(f.heads)
	*f = filler{first: f.first[:0], part: f.part, mem: f.mem, heads: f.heads}
}
