"""Random small instances as instance JSON, and the plain count of a colouring's cost."""

import random


def random_instance(masks, seed, tied=False):
    """Features of one to four fragments, with everything an instance may hold."""
    rng = random.Random(1000 * seed + masks)
    sizes = [rng.randint(1, 4) for _ in range(rng.randint(3, 4 + masks))]
    starts = [sum(sizes[:i]) for i in range(len(sizes))]
    features = [list(range(start, start + size)) for start, size in zip(starts, sizes)]
    stitches, spacings = [], []
    cycles, spaced = rng.choice([0, 0, 0.4]), rng.choice([0, 0.6])
    for fragments in features:
        order = rng.sample(fragments, len(fragments))
        for i in range(1, len(order)):
            parent = rng.randrange(i)
            for j in range(i):
                if j == parent or rng.random() < cycles:
                    stitches.append([order[i], order[j], rng.randint(1, 3)])
                elif rng.random() < spaced:
                    spacings.append([order[i], order[j]])
    pairs, dense, wide = [], rng.choice([0.5, 0.8, 1]), rng.choice([0.2, 0.6, 1])
    for i, first in enumerate(features):
        for second in features[:i]:
            edges = [[a, b] for a in first for b in second]
            sure = rng.choice(edges)
            chosen = [edge for edge in edges if edge == sure or rng.random() < wide]
            if rng.random() < dense:
                pairs.append(chosen)
    allowed, restricted = [], rng.choice([0, 0.2, 0.7])
    for fragment in range(sum(sizes)):
        if rng.random() < restricted:
            some = rng.sample(range(1, masks + 1), rng.randint(1, min(masks, 3)))
            allowed.append([fragment, sorted(some)])
    ties = some_ties(rng, features, stitches, masks, dict(allowed)) if tied else {}
    return ties | {
        "format": "maskproof-instance",
        "version": 1,
        "masks": masks,
        "features": sizes,
        "allowed": allowed,
        "pairs": pairs,
        "stitches": stitches,
        "self_spacings": spacings,
    }


def some_ties(rng, features, stitches, masks, allowed):
    """Ties that a colouring drawn at random keeps."""
    kept = {}
    for fragments in features:
        common = [m for m in range(1, masks + 1) if all(m in allowed.get(f, [m]) for f in fragments)]
        one = rng.choice(common) if common and rng.random() < 0.6 else None
        for fragment in fragments:
            kept[fragment] = one or rng.choice(allowed.get(fragment, range(1, masks + 1)))
    same, different, at_most = [], [], []
    for i, first in enumerate(features):
        for second in features[:i]:
            if rng.random() < 0.2:
                a, b = rng.choice(second), rng.choice(first)
                (same if kept[a] == kept[b] else different).append([a, b])
        own = [[min(a, b), max(a, b)] for a, b, _ in stitches if a in first]
        some = [[a, b, rng.randint(1, 2)] for a, b in sorted(own) if rng.random() < 0.7]
        most = sum(weight for a, b, weight in some if kept[a] != kept[b])
        if most < sum(weight for _, _, weight in some):
            at_most.append([most, some])
    return {"same": same, "different": different, "at_most": at_most}


def feature_of(instance, fragment):
    """The feature of a fragment."""
    feature, end = -1, 0
    while end <= fragment:
        feature += 1
        end += instance["features"][feature]
    return feature


def cost(instance, colouring):
    """(conflicts, stitches) of a colouring, a mask 1..K a fragment; an error if it is not legal."""
    masks = instance["masks"]
    if len(colouring) != sum(instance["features"]):
        raise ValueError("the colouring has another length than the instance")
    if not all(1 <= mask <= masks for mask in colouring):
        raise ValueError("a mask is out of range")
    for fragment, allowed in instance.get("allowed", []):
        if colouring[fragment] not in allowed:
            raise ValueError(f"fragment {fragment} has mask {colouring[fragment]}")
    stitches = instance.get("stitches", [])
    conflicts = sum(
        any(colouring[a] == colouring[b] for a, b in edges) for edges in instance["pairs"]
    )
    conflicts += len(
        {
            feature_of(instance, a)
            for a, b in instance.get("self_spacings", [])
            if colouring[a] == colouring[b] and b not in joined(colouring, stitches, a)
        }
    )
    kept = [colouring[a] == colouring[b] for a, b in instance.get("same", [])]
    kept += [colouring[a] != colouring[b] for a, b in instance.get("different", [])]
    for most, edges in instance.get("at_most", []):
        kept.append(sum(w for a, b, w in edges if colouring[a] != colouring[b]) <= most)
    if not all(kept):
        raise ValueError("the colouring breaks a tie")
    changed = sum(weight for a, b, weight in stitches if colouring[a] != colouring[b])
    return conflicts, changed


def joined(colouring, stitches, start):
    """The fragments joined to `start` through fragments of its mask."""
    seen, waiting = {start}, [start]
    while waiting:
        at = waiting.pop()
        for a, b, _ in stitches:
            for here, there in ((a, b), (b, a)):
                if here == at and there not in seen and colouring[there] == colouring[start]:
                    seen.add(there)
                    waiting.append(there)
    return seen
