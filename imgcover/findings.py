"""What was noticed while measuring: one registry of codes, their words and their remedies.

A finding never stops the road. The registry is the only place where a code is defined; the
README's table and the record's `findings` are made from it. A member's name in kebab-case is its
code. The message and the remedy may be said more exactly where the finding is made.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from enum import Enum, StrEnum, unique


class Severity(StrEnum):
    """How much a finding weighs."""

    INFO = "info"
    """Worth knowing; changes nothing."""
    WARNING = "warning"
    """A number is weaker than it looks, or a decision stays open."""
    REFUSAL = "refusal"
    """Something could not be measured and is null."""


@unique
class Flag(Enum):
    """Every code a finding can carry, as `severity: message → remedy`."""

    # picture
    PICTURE_UNREADABLE = """refusal: the picture could not be read
        → scan or export it again"""
    FIRST_PAGE_ONLY = """info: the file holds several pages; only the first was measured
        → split the file to measure the others"""
    CLIPPED_LIGHT = """warning: part of the picture is at the largest value the file can hold
        → lower the exposure and take the picture again"""
    CLIPPED_DARK = """info: part of the picture is at zero, the darkest the file can hold
        → raise the exposure if that is cloth, not the bed around it"""
    MISNAMED_PICTURE = """info: the file is another kind of picture than its name says
        → rename the file"""
    PICTURE_TURNED = """info: the picture was turned as its orientation mark says
        → check that the warp runs as --warp says in the picture as shown"""
    ORIENTATION_UNKNOWN = """warning: the stored orientation is none that exists: no turn was
        applied
        → check that the warp runs as --warp says"""
    EXIF_UNREADABLE = """warning: the EXIF block could not be read: no turn was applied
        → check that the warp runs as --warp says"""
    DPI_CONTRADICTS_ITSELF = """warning: the file states two resolutions: neither was used
        → give --pitch, or lay a rule in the picture (--rule auto)"""
    CHANNEL_CHOSEN = """info: the channel of a colour picture that was measured
        → scan in grey to leave no choice"""
    TONE_FROM_FILE = """info: the transfer curve is the one the file states, not sRGB
        → give --tone if the file states it wrongly"""
    TONE_AGAINST_FILE = """warning: the stated transfer curve is not the one the file claims
        → leave --tone out to follow the file"""
    # request
    REGION_OUTSIDE = """refusal: the region that was asked for does not lie inside the picture
        → give --region as X,Y,W,H in pixels of the picture as shown"""
    EXPOSURE_OTHER_SIZE = """refusal: the blank or dark exposure has another size than the picture
        → take it with the same camera, place and resolution"""
    # scale
    NO_SCALE = """refusal: nothing says how many pixels make a millimetre
        → give --pitch, lay a rule in the picture (--rule auto), or use --device or --metadata"""
    PITCH_TAKEN_AS_EXACT = """info: the stated pitch was taken as exact
        → give --pitch-u if it is not"""
    SCALE_FROM_METADATA = """info: the scale is what the file claims of itself; nothing in the
        picture bears it out
        → lay a rule in the picture (--rule auto), or make a device certificate"""
    METADATA_NOT_TRUSTED = """info: the resolution in the file was not used
        → say --metadata to use it, or better, lay a rule in the picture"""
    METADATA_DISAGREES = """warning: the file claims another resolution than the one used
        → check the stated pitch, and that the picture was not resampled"""
    SCALES_DISAGREE = """warning: two ways of finding the scale disagree by more than twice their
        uncertainty
        → find out which is wrong: check the rule, the stated pitch and the device"""
    # scale: rule
    NO_RULE_FOUND = """warning: no rule was found in the picture
        → lay a clean, opaque rule flat on the cloth, at least 22 mm or two inch lines of it in
        the frame"""
    RULE_UNIT_OPEN = """warning: the rule's unit is not certain from its lines
        → say --rule mm or --rule inch, or let more of the rule into the frame"""
    RULE_REFUSED = """warning: a rule was found but its scale cannot be trusted
        → lay the rule flat beside the cloth and take the picture square from above"""
    RULE_READ = """info: the scale was read from a rule in the picture
        → check that the stated lines are those of the rule"""
    RULE_ONE_WAY = """info: one rule gives one direction; the other may differ by up to 1 % and
        carries that
        → lay a second rule across the first, or use a device certificate"""
    RULE_TILT_CORRECTED = """info: the rule lies slightly aslant to the camera; its graduations show
        by how much
        → take the picture square from above, or scan it"""
    # scale: sheet and certificate
    NO_SHEET_FOUND = """warning: no scale sheet was found in the picture
        → print one with: imgcover calibrate sheet -o sheet.pdf"""
    SHEET_NOT_MEASURED = """warning: the scale sheet shows, but its bars were not measured: printers
        do not keep their scale
        → measure both bars with a steel rule and give --bars A,B"""
    SHEET_REFUSED = """warning: the scale sheet shows, but its scale cannot be trusted
        → lay it flat and take the picture square from above"""
    CERTIFICATE_EXPIRED = """warning: the device's certificate is not valid today
        → scan the sheet again: imgcover calibrate check, or calibrate read for a new one"""
    CERTIFICATE_OTHER_RESOLUTION = """warning: the device's certificate was made at another
        resolution
        → make a certificate at the resolution you scan at"""
    CERTIFICATE_RESOLUTION_UNCHECKED = """info: the file states no resolution: that it is the
        certificate's was taken on trust
        → keep the resolution in the file when saving"""
    CERTIFICATE_AXES_UNKNOWN = """warning: it cannot be told which of the certificate's axes is
        which: their mean was used
        → measure the file as the scanner wrote it"""
    # threads
    TOO_COARSE = """refusal: fewer than 3 pixels a thread: the picture is too coarse to count
        → scan at a higher resolution"""
    FEW_PIXELS_A_THREAD = """warning: only 3 to 5 pixels a thread
        → scan at a higher resolution to be safe"""
    NO_CROSSING_THREADS = """refusal: no two crossing sets of threads stand out: nothing was counted
        → take a sharp picture of flat cloth that fills the frame, at 10 or more pixels a thread"""
    NOT_WOVEN = """refusal: what repeats in the picture does not look like ends crossing picks:
        nothing was counted
        → if it is woven cloth, scan it at a higher resolution or on a light table"""
    TWO_READINGS = """refusal: two readings of the threads stay possible: not counted
        → look at the cloth under a glass, or scan it at a higher resolution"""
    THREADS_LOST = """refusal: the threads could not be followed over the field: not counted
        → give --region around a flat, sharp, evenly lit part"""
    TOO_FEW_THREADS = """refusal: fewer than six threads lie in the picture
        → take in more of the cloth"""
    RESTS_ON_DECLARED_WEAVE = """warning: two readings were possible and the declared weave decided
        between them
        → confirm the weave under a glass"""
    WARP_UNCERTAIN = """warning: the swatch is turned by about 45 degrees: which set is the warp is
        a guess
        → lay the warp along an edge of the picture"""
    SWATCH_TURNED = """info: the swatch does not lie straight
        → nothing to do: densities are taken at right angles to the threads"""
    TILES_LEFT_OUT = """info: parts of the field could not be followed and were left out
        → look at the overlay"""
    MIDDLE_COUNTED = """info: the picture is large; its middle was counted
        → give --region to count another part"""
    # cover
    LIGHT_NOT_STATED = """info: optical cover was not measured: the light was not stated
        → say --light backlit for a picture on a light table, --light reflected otherwise"""
    NO_CLOTH_TO_COVER = """refusal: optical cover was not measured: no woven cloth was found in the
        picture
        → show nothing but cloth before the light, or give its place with --region"""
    COVER_NEEDS_BACKLIGHT = """info: optical cover was not measured: the picture was taken in
        reflected light
        → photograph the swatch on a light table and say --light backlit"""
    COVER_NOT_BACKLIT = """refusal: optical cover was not measured: the light does not come through
        pores between threads
        → check that the swatch lies on a light table and nothing lights it from the front"""
    COVER_NOT_RESOLVED = """refusal: optical cover was not measured: the pores are too small for
        this picture
        → scan at a higher resolution or focus better; --blank helps"""
    COVER_CLIPPED = """refusal: optical cover was not measured: the light through the pores is
        clipped
        → lower the exposure and take the picture again"""
    NEARLY_SHUT = """info: the cloth is nearly shut: an upper bound on its open area is given
        → scan at a higher resolution to see smaller pores"""
    COVER_WITNESSES_DISAGREE = """warning: the pores' edges and the light through them tell
        different covers
        → look for dirt, stains or lint on the cloth; its u holds both"""
    COVER_UNEVEN = """refusal: optical cover was not measured: the pores cannot be explained by one
        blur and one light
        → take the picture again, flat, in focus and without sharpening, or give --region"""
    COVER_PICTURE_ODD = """warning: blur in a part of the field, sharpening or clipped light widen
        the uncertainty of the cover
        → take the picture again, flat, in focus and without sharpening"""
    COVER_BY_LEVELS_ONLY = """warning: the threads are not known, so cover rests on two levels of
        light alone
        → make both ends and picks countable"""
    COVER_ON_A_CARD = """warning: cover was measured on a card in reflected light; shadows widen
        its u
        → photograph the swatch on a light table for a better figure"""
    COVER_FROM_LOSSY = """info: the picture is or was stored with losses, which widen the
        uncertainty of the cover
        → store PNG or TIFF from the start"""
    COVER_FROM_WINDOWS = """info: cover was measured in windows spread evenly over the field
        → nothing to do: its u holds how much the windows differ"""
    # cloth
    PACKING_ASSUMED = """info: how the yarn was spun is not declared; its packing was taken
        → write spinning or packing in the declaration"""
    CRIMP_ASSUMED = """info: the crimp is not declared; a range was taken for the mass
        → write crimp in the declaration"""
    MASS_ONLY_INDICATES = """info: size or the change in finishing is not declared: the predicted
        mass only indicates
        → write size (grey) or finish_change (finished) in the declaration"""
    FRACTION_CAPPED = """warning: the declared yarns are wider than their spacing; the fraction was
        taken as 1
        → check the declared sett and count; threads that overlap cannot be told by a model"""
    CANNOT_BE_WOVEN = """warning: the declared construction passes the limit of weaving
        → check the declared setts, counts and weave: one of them cannot be true"""
    AT_THE_WEAVING_LIMIT = """info: the declared construction is as tight as can be woven
        → check the declared setts and counts"""
    DECLARED_COVER_UNLIKELY = """warning: the declared cover is not what the declared counts and
        setts predict
        → check the declared cover, or declare how the yarns are flattened"""
    DECLARED_MASS_UNLIKELY = """warning: the declared mass is not what the declared counts and setts
        predict
        → check the declared mass, counts, crimp and finishing"""
    # verdict
    COVER_DIFFERS_FROM_MODEL = """warning: the optical cover differs from what the declared
        construction leads to
        → read the diagnosis: it weighs which declared figure cannot be true"""
    MASS_NOT_WEIGHED = """info: the declared mass was not judged: no weighing was given
        → weigh a cut of known area and give --gsm"""
    FEWER_PLACES_THAN_STANDARD = """warning: fewer places than the five that ISO 7211-2 asks for
        → take pictures at more places of the lot"""
    SHORTER_LENGTH_THAN_STANDARD = """info: threads were counted over a shorter length than ISO
        7211-2 asks for at this density
        → scan a larger field"""
    PICTURES_OF_A_PLACE_DISAGREE = """warning: pictures of one place give densities further apart
        than their uncertainties
        → see whether they show the same place and have the right scale"""
    # audit
    PICTURE_OUT_OF_REACH = """refusal: the picture is not there, lies outside the audited folder, or
        is no ordinary file
        → check its name in the lot sheet, or copy the picture itself into the folder"""
    MEASURING_DIED = """refusal: measuring ended its process twice, the second time alone on the
        machine
        → export the picture again; if it is sound, give the machine more memory"""
    MEASURING_TOOK_TOO_LONG = """refusal: measuring was not done within its time limit, twice
        → audit again with a longer --time-limit, or export the picture again"""
    PROGRAM_FAULT = """refusal: the program itself failed on this picture
        → run imgcover measure on it with IMGCOVER_DEBUG=1 and report what it says"""
    OPTION_UNUSABLE = """refusal: a file that an option names cannot be used
        → correct the option and audit again"""
    DECLARATION_UNREADABLE = """warning: the declaration could not be read, so nothing was decided
        → correct the article file and audit again"""
    SAME_PICTURE_TWICE = """warning: two pictures of a lot show the same pixels and were counted
        once
        → take a picture of each place"""

    def __init__(self, told: str) -> None:
        weight, _, said = " ".join(told.split()).partition(": ")
        self.severity = Severity(weight)
        """How much a finding with this code weighs."""
        self.message, _, self.remedy = said.partition(" → ")
        """What is said, and what to do, when nothing more exact is known."""

    @property
    def code(self) -> str:
        """The member's name in kebab-case, as the record shows it."""
        return self.name.lower().replace("_", "-")


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing noticed, in words for the inspector."""

    flag: Flag
    message: str
    remedy: str

    @property
    def code(self) -> str:
        """The code of the finding's flag."""
        return self.flag.code

    @property
    def severity(self) -> Severity:
        """How much the finding weighs."""
        return self.flag.severity


def found(flag: Flag, message: str | None = None, remedy: str | None = None) -> Finding:
    """Make a finding, in the registry's words unless better ones are given."""
    return Finding(flag, flag.message if message is None else message, remedy or flag.remedy)


def has(findings: Iterable[Finding], flag: Flag) -> bool:
    """Whether any of the findings carries the flag."""
    return any(each.flag is flag for each in findings)


__all__ = ["Finding", "Flag", "Severity", "found", "has"]
