"""The mire strider in numbers: joints, bones and the parts of its body.

Metres, y up, z forward; the left half (x > 0), names in .L are mirrored. A station is a joint or a
point with a radius.
"""


JOINTS = [  # name, parent, position, radius of the body there
    ("root", None, (0, 0, 0), 0),
    ("pelvis", "root", (0, 1.13, -.36), .150),
    ("spine_1", "pelvis", (0, 1.165, -.17), .165),
    ("spine_2", "spine_1", (0, 1.19, .03), .175),
    ("spine_3", "spine_2", (0, 1.19, .22), .165),
    ("neck_1", "spine_3", (0, 1.25, .43), .118),
    ("neck_2", "neck_1", (0, 1.43, .59), .083),
    ("neck_3", "neck_2", (0, 1.64, .60), .066),
    ("head", "neck_3", (0, 1.82, .65), .066),
    ("jaw", "head", (0, 1.785, .79), .050),
    ("shoulder.L", "spine_3", (.08, 1.17, .29), .100),
    ("upper_arm.L", "shoulder.L", (.165, 1.08, .33), .108),
    ("forearm.L", "upper_arm.L", (.225, .81, .17), .060),
    ("hand.L", "forearm.L", (.215, .41, .36), .044),
    ("fingers.L", "hand.L", (.225, .07, .30), .044),
    ("hip.L", "pelvis", (.08, 1.12, -.36), .110),
    ("thigh.L", "hip.L", (.165, 1.05, -.36), .132),
    ("shin.L", "thigh.L", (.235, .79, -.14), .070),
    ("foot.L", "shin.L", (.225, .46, -.47), .047),
    ("toe_a.L", "foot.L", (.245, .07, -.36), .044),
    ("toe_b.L", "foot.L", (.225, .07, -.36), .044),
    ("tail_1", "pelvis", (0, 1.13, -.58), .122),
    ("tail_2", "tail_1", (0, 1.08, -.82), .085),
    ("tail_3", "tail_2", (0, 1.07, -1.07), .061),
    ("tail_4", "tail_3", (0, 1.12, -1.31), .047),
]

CENTRE_OF = {"shoulder": "spine_3", "upper_arm": "spine_3"}  # else the pelvis

BEAK, CHIN = ((0, 1.745, 1.15), .024), ((0, 1.655, 1.07), .023)

CLAW_A, CLAW_B = ((.330, .027, .49), .026), ((.160, .027, .50), .026)

TOE_A, TOE_B = ((.360, .027, -.16), .026), ((.165, .027, -.14), .026)

HEEL, SPUR = ((.235, .07, -.36), .044), ((.250, .029, -.50), .026)
TAIL_TIP = ((0, 1.23, -1.53), .040)

BONES = [  # joint, joint it fades from, its stations, joint it fades to
    ("pelvis", None, "pelvis", "spine_1", "spine_1"),
    ("spine_1", "pelvis", "spine_1", "spine_2", "spine_2"),
    ("spine_2", "spine_1", "spine_2", "spine_3", "spine_3"),
    ("spine_3", "spine_2", "spine_3", "neck_1", "neck_1"),
    ("neck_1", "spine_3", "neck_1", "neck_2", "neck_2"),
    ("neck_2", "neck_1", "neck_2", "neck_3", "neck_3"),
    ("neck_3", "neck_2", "neck_3", "head", "head"),
    ("head", "neck_3", "head", BEAK, None),
    ("jaw", "head", "jaw", CHIN, None),
    ("tail_1", "pelvis", "tail_1", "tail_2", "tail_2"),
    ("tail_2", "tail_1", "tail_2", "tail_3", "tail_3"),
    ("tail_3", "tail_2", "tail_3", "tail_4", "tail_4"),
    ("tail_4", "tail_3", "tail_4", TAIL_TIP, None),
    ("shoulder.L", "spine_3", "shoulder.L", "upper_arm.L", "upper_arm.L"),
    ("upper_arm.L", "shoulder.L", "upper_arm.L", "forearm.L", "forearm.L"),
    ("forearm.L", "upper_arm.L", "forearm.L", "hand.L", "hand.L"),
    ("hand.L", "forearm.L", "hand.L", "fingers.L", "fingers.L"),
    ("fingers.L", "hand.L", "fingers.L", CLAW_A, None),
    ("fingers.L", "hand.L", "fingers.L", CLAW_B, None),
    ("hip.L", "pelvis", "hip.L", "thigh.L", "thigh.L"),
    ("thigh.L", "hip.L", "thigh.L", "shin.L", "shin.L"),
    ("shin.L", "thigh.L", "shin.L", "foot.L", "foot.L"),
    ("foot.L", "shin.L", "foot.L", HEEL, None),
    ("toe_a.L", "foot.L", "toe_a.L", TOE_A, None),
    ("toe_b.L", "foot.L", "toe_b.L", TOE_B, None),
    ("foot.L", None, HEEL, SPUR, None),
]

TUBES = {  # rounded chains of stations
    "trunk": [
        [TAIL_TIP, "tail_4", "tail_3", "tail_2", "tail_1", "pelvis", "spine_1", "spine_2",
         "spine_3", "neck_1", "neck_2", "neck_3", "head"],
        [((0, 1.835, .72), .070), ((0, 1.80, .92), .046), BEAK]],
    "jaw": [["jaw", ((0, 1.722, .93), .035), CHIN]],
    "leg": [
        ["shoulder.L", "upper_arm.L", "forearm.L", "hand.L", "fingers.L"],
        ["fingers.L", ((.285, .036, .40), .030), CLAW_A],
        ["fingers.L", ((.190, .036, .40), .030), CLAW_B],
        ["hip.L", "thigh.L", "shin.L", "foot.L", HEEL],
        ["toe_a.L", ((.310, .036, -.26), .030), TOE_A],
        ["toe_b.L", ((.192, .036, -.25), .030), TOE_B],
        [HEEL, SPUR],
        [((.235, .71, -.22), .066), ((.23, .60, -.33), .052)],  # calves
        [((.223, .73, .208), .058), ((.220, .60, .268), .046)]],
    "eye": [[((.060, 1.868, .775), .030), ((.064, 1.870, .780), .029)]],
}

ELLIPSOIDS = [((0, 1.10, .05), (.175, .185, .36)),  # belly
              ((0, 1.850, .725), (.080, .078, .120))]  # skull

LEAVES = {  # flattened tubes of two stations, the direction in which they are thin, and how thin
    "trunk": [(((0, 1.26, .17), .100), ((0, 1.44, .01), .066), (1, 0, 0), .42),  # dorsal fins
              (((0, 1.24, -.13), .090), ((0, 1.38, -.28), .062), (1, 0, 0), .44),
              (((0, 1.87, .69), .060), ((0, 1.965, .48), .056), (1, 0, 0), .46),  # crest
              (((0, 1.20, -1.48), .080), ((0, 1.30, -1.63), .100), (1, 0, 0), .40)],  # tail paddle
    "frill": [(((.045, 1.83, .66), .050), ((.165, 1.86, .49), .074), (.8169, 0, .5767), .50)],
}

SOFTNESS = {"trunk": .06, "leg": .04, "jaw": .03, "frill": .03, "eye": .012}  # of the merging

CELL = [  # height, cell size there across and upwards; linear between
    (0, .0180, .0130), (.10, .0200, .019), (.25, .0235, .036), (.75, .0270, .036),
    (.95, .0330, .032), (1.30, .0345, .031), (1.58, .0230, .025), (2.2, .0200, .0200)]


def station(at):
    """Position and radius of a station."""
    if isinstance(at, str):
        return next((place, radius) for name, _, place, radius in JOINTS if name == at)
    return at


def mirrored(name):
    """The name on the other side; names without a side stay."""
    return name[:-2] + {".L": ".R", ".R": ".L"}.get(name[-2:], name[-2:])


def joints_of_both_sides():
    """JOINTS with each left limb followed by its right one, parents before children."""
    both, limb = [], []
    for name, parent, place, _ in JOINTS + [("", None, None, 0)]:
        if limb and not (name.endswith(".L") and parent.endswith(".L")):
            both += limb + [(mirrored(n), mirrored(p), (-x, y, z)) for n, p, (x, y, z) in limb]
            limb = []
        if name.endswith(".L"):
            limb.append((name, parent, place))
        elif name:
            both.append((name, parent, place))
    return both
