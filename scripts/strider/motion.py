"""The two clips. Turns in the plane of a leg are unit complex numbers: no angle is ever needed."""
import numpy as np

from strider.creature import station
from strider.vectors import expect, smoothstep


def turn(degrees):
    """Unit complex number at an angle, by Taylor series of the small rest and quarter turns."""
    quarters = int(np.rint(degrees / 90.0))
    x = (degrees - 90.0 * quarters) * (3.14159265358979323846 / 180.0)
    square, cosine, sine, term = x * x, 1.0, x, 1.0
    for n in range(1, 12):
        term = -term * square / ((2 * n - 1) * (2 * n))
        cosine += term
        sine += term * x / (2 * n + 1)
    for _ in range(quarters % 4):
        cosine, sine = -sine, cosine
    return complex(cosine, sine)


def times(a, b):
    """a · b for complex numbers, written out: the interpreter's own may differ between builds."""
    return complex(a.real * b.real - a.imag * b.imag, a.real * b.imag + a.imag * b.real)


def divided(a, b):
    size = b.real * b.real + b.imag * b.imag
    return complex((a.real * b.real + a.imag * b.imag) / size,
                   (a.imag * b.real - a.real * b.imag) / size)


def size_of(a):
    return float(np.sqrt(a.real * a.real + a.imag * a.imag))


def about_x(rotation):
    """Quaternion (x, y, z, w) of a unit complex number that turns y towards z."""
    w = float(np.sqrt(max(.5 + .5 * rotation.real, 1e-12)))
    return (.5 * rotation.imag / w, 0.0, 0.0, w)


def product(p, q):
    (a, b, c, d), (e, f, g, h) = p, q
    return (d * e + a * h + b * g - c * f, d * f - a * g + b * h + c * e,
            d * g + a * f - b * e + c * h, d * h - a * e - b * f - c * g)


def euler(x=0.0, y=0.0, z=0.0):
    """Quaternion of turns in degrees about x, then z, then y."""
    q = about_x(turn(x))
    for degrees, axis in ((z, 2), (y, 1)):
        half = turn(.5 * degrees)
        q = product(tuple(half.imag if i == axis else 0.0 for i in range(3)) + (half.real,), q)
    return q


LEGS = {"hind": ("thigh", "shin", "foot", ("toe_a", "toe_b")),
        "fore": ("upper_arm", "forearm", "hand", ("fingers",))}


def leg_pose(pair, side, lift, reach, raise_heel, droop, body):
    """Rotations of a leg whose ball of the foot is moved by (lift, reach) while the body has moved
    by `body` (both y, z), whose foot is turned by raise_heel and its toes by droop, in degrees.
    The law of cosines gives the rotations as complex numbers without any angle."""
    upper, lower, foot, toes = LEGS[pair]
    chain = (upper, lower, foot, toes[0])
    hip, knee, hock, ball = (complex(*station(name + ".L")[0][1:]) for name in chain)
    c = turn(raise_heel)
    target = ball + complex(lift, reach) - times(c, ball - hock) - hip - complex(*body)
    a, b, far = size_of(knee - hip), size_of(hock - knee), size_of(target)
    cosine = (a * a + far * far - b * b) / (2.0 * a * far)
    expect(-1.0 < cosine < 1.0, "a leg cannot reach its target")
    sine = float(np.sqrt(1.0 - cosine * cosine))
    rest = divided(knee - hip, hock - hip)
    bend = complex(cosine, sine if rest.imag > 0 else -sine)
    to_knee = times(times(bend, target), complex(a / far, 0.0))
    thigh, shin = divided(to_knee, knee - hip), divided(target - to_knee, hock - knee)
    pose = {upper: thigh, lower: divided(shin, thigh), foot: divided(c, shin)}
    for toe in toes:
        pose[toe] = divided(turn(droop), c)
    return {name + side: about_x(rotation) for name, rotation in pose.items()}


def wade():
    """Walk cycle of one second at 24 Hz: high steps through shallow water. The last key closes the
    loop. Feet move back on the ground for 62 % of the cycle, then swing forward."""
    poses, moves = [], []
    for key in range(25):
        phase = key / 24.0
        wave, double = turn(360.0 * phase), turn(720.0 * phase)
        body = (-.022 + .012 * double.real, .008 * double.imag)
        pose = {}
        for pair, side, offset in (("hind", ".L", .0), ("fore", ".L", .25),
                                   ("hind", ".R", .5), ("fore", ".R", .75)):
            t = (phase + offset) % 1.0
            stance = min(t / .62, 1.0)
            swing = max((t - .62) / .38, 0.0)
            ease = float(smoothstep(swing))
            hump = 16.0 * swing * swing * (1.0 - swing) * (1.0 - swing)
            leave = float(smoothstep((stance - .7) / .3)) * (1.0 - ease)
            reach = .15 - .30 * stance + .30 * ease
            fore = pair == "fore"
            pose.update(leg_pose(pair, side, .17 * hump + .03 * leave, reach,
                                 (-8.0 if fore else 10.0) * hump + 14.0 * leave,
                                 42.0 * hump, body))
        late, later = turn(360.0 * phase - 50.0), turn(360.0 * phase - 100.0)
        pose.update({
            "spine_1": euler(y=3.0 * wave.real, z=1.5 * wave.imag),
            "spine_2": euler(y=-3.0 * wave.real, z=-1.5 * wave.imag),
            "neck_1": euler(x=5.0 * double.imag, y=-2.0 * wave.real, z=-3.0 * wave.imag),
            "neck_2": euler(x=-3.0 * double.imag, y=2.0 * late.real),
            "head": euler(x=-4.0 * double.imag + 2.0, y=1.5 * late.real),
            "tail_1": euler(x=-3.0 + 2.0 * double.real, y=7.0 * wave.real),
            "tail_2": euler(y=9.0 * late.real),
            "tail_3": euler(y=11.0 * later.real),
            "tail_4": euler(x=4.0, y=12.0 * later.real)})
        poses.append(pose)
        moves.append((.014 * wave.imag, body[0], body[1]))
    return tracks("Wade", poses, moves)


def startle():
    """Three quarters of a second: a crouch, the neck jerks back, the tail whips up, one foot lifts,
    the beak snaps open and shut (a STEP track)."""
    poses, moves = [], []
    for key in range(19):
        up, down = float(smoothstep(key / 4.0)), float(smoothstep((key - 9.0) / 9.0))
        jerk = up * (1.0 - down)
        shiver = jerk * turn(120.0 * key).imag
        body = (-.13 * jerk, -.06 * jerk)
        pose = {}
        for pair, side in (("hind", ".L"), ("fore", ".L"), ("hind", ".R"), ("fore", ".R")):
            lifted = jerk if (pair, side) == ("fore", ".L") else 0.0
            pose.update(leg_pose(pair, side, .22 * lifted, .10 * lifted, -14.0 * lifted,
                                 40.0 * lifted, body))
        pose.update({
            "spine_2": euler(x=-3.0 * jerk), "spine_3": euler(x=-3.0 * jerk, y=4.0 * jerk),
            "neck_1": euler(x=-24.0 * jerk, y=6.0 * jerk),
            "neck_2": euler(x=-16.0 * jerk, y=8.0 * jerk),
            "neck_3": euler(x=22.0 * jerk, y=8.0 * jerk),
            "head": euler(x=26.0 * jerk, y=5.0 * jerk + 2.0 * shiver),
            "tail_1": euler(x=20.0 * jerk), "tail_2": euler(x=18.0 * jerk, y=4.0 * shiver),
            "tail_3": euler(x=14.0 * jerk, y=6.0 * shiver),
            "tail_4": euler(x=-20.0 * jerk, y=8.0 * shiver)})
        poses.append(pose)
        moves.append((0.0, body[0], body[1]))
    clip = tracks("Startle", poses, moves)
    beak = [euler(), euler(x=16.0), euler(x=4.0), euler(x=12.0), euler()]
    clip["tracks"].append(("jaw", "rotation", "STEP", [0, 3, 7, 10, 15], beak))
    return clip


def tracks(name, poses, moves):
    keys = list(range(len(poses)))
    found = [("root", "translation", "LINEAR", keys, moves)]
    for joint in poses[0]:
        found.append((joint, "rotation", "LINEAR", keys, [pose[joint] for pose in poses]))
    return {"name": name, "tracks": found}


def as_rotations(values):
    q = np.array(values, dtype=float)
    square = q * q
    q = q / np.sqrt(square[:, 0] + square[:, 1] + square[:, 2] + square[:, 3])[:, None]
    return np.rint(q * 1e9) / 1e9 + 0.0
