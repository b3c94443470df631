/** Sixteen numbers, row by row unless a convention's `order` says otherwise. */
export type Matrix16 = number[];

/** A person's convention, by its physical facts; each defaults to the first. */
export interface Convention {
    /** Which way angles count, for an observer who faces the source. */
    angles?: "counterclockwise" | "clockwise";
    /** How the field of a state with S3 > 0 turns, for an observer who faces the source. */
    positiveS3?: "clockwise" | "counterclockwise";
    /** From which axis angles count. */
    zeroAngle?: "x" | "y";
    /** The sign of iωt. */
    time?: "plus" | "minus";
    /** How the sixteen numbers of the request are laid out. Results are always row by row. */
    order?: "rows" | "columns";
}

/** A polarizer at rest and a retarder that turns; how far they are from what the reduction took them for. */
export interface SystematicSide {
    /** What the retardance was taken for. Default 90. */
    retardanceDeg?: number;
    /** Where the polarizer stands. Default 0. */
    polarizerDeg?: number;
    /** Standard uncertainties; each defaults to none. */
    retardanceSigmaDeg?: number;
    /** Of the azimuth of the side as a whole. */
    azimuthSigmaDeg?: number;
    /** Of the factor on its degree of polarization. */
    contrastSigma?: number;
}

/** Uncertainties of the instrument, the same in every repeat; not without a random part. */
export interface Systematic {
    generator?: SystematicSide;
    analyser?: SystematicSide;
    /** Of constant light in every reading, as a share of M00. */
    darkSigma?: number;
}

/** What is known of the noise; it refers to the matrix as given. */
export type Noise = { systematic?: Systematic } & (
    | { kind: "none" }
    /** One σ, in the unit of the matrix. */
    | { kind: "uniform"; sigma: number }
    /** σ as a share of |M00|. */
    | { kind: "relative"; fraction: number }
    /** A σ for each element, laid out as the matrix; 0 for an exact one. */
    | { kind: "perElement"; sigma: Matrix16 }
    /** Of the elements as they are laid out, 16 × 16 row by row; rows of zeros for exact ones. */
    | { kind: "covariance"; covariance: number[] }
    /** The scatter of repeats, up to 40 pooled over the elements; `mueller` is then null, and their mean is meant. */
    | { kind: "replicates"; matrices: Matrix16[] }
    | { kind: "rounding"; decimals: number }
);

export interface Measurement {
    /** Null with repeats. */
    mueller: Matrix16 | null;
    /** M00 has no error: the matrix was divided by it. */
    normalised?: boolean;
    /** M00 is a transmittance or reflectance. */
    absolute?: boolean;
    convention?: Convention;
    noise?: Noise;
}

export interface ExamineRequest extends Measurement {
    /** 0 leaves out p-value and standard errors. Default 2000. */
    draws?: number;
    /** A whole number; the same seed gives the same digits. Default 1. */
    seed?: number;
}

/** `null` is "not determined", and `reason` says why. */
export interface Figure {
    value: number | null;
    se: number | null;
    low: number | null;
    high: number | null;
    method: "first-order" | "percentile" | "noncentral" | "upper-limit" | "one-sided" | null;
    unit: "1" | "deg" | "matrix";
    reason: string | null;
    /** What noise adds to a length on average, where an estimate of that is published; null elsewhere. */
    bias: number | null;
    /** The length without it. */
    debiased: number | null;
}

export type FigureName =
    | "diattenuation"
    | "linearDiattenuation"
    | "circularDiattenuation"
    | "diattenuationAzimuthDeg"
    | "polarizance"
    | "linearPolarizance"
    | "circularPolarizance"
    | "polarizanceAzimuthDeg"
    | "transmittanceMax"
    | "transmittanceMin"
    | "depolarizationIndex"
    | "sphericalPurity"
    | "purityIndex1"
    | "purityIndex2"
    | "purityIndex3"
    | "entropy"
    | "isotropicAlpha"
    | "retardanceDeg"
    | "linearRetardanceDeg"
    | "rotationDeg"
    | "fastAxisDeg"
    | "retarderAzimuthDeg"
    | "retarderEllipticityDeg"
    | "depolarizationPower";

export interface Realizability {
    /** `notRealizable`: no noise was stated, or none was tested. */
    verdict: "realizable" | "withinNoise" | "beyondNoise" | "notRealizable";
    /** Of H / |M00|, descending. */
    eigenvalues: number[] | null;
    eigenvalueSe: number[] | null;
    /** Frobenius distance to the nearest realizable matrix over |M00|. */
    violation: number | null;
    /** The squared distance over σ². */
    statistic: number | null;
    pValue: number | null;
    simulations: number | null;
    reason: string | null;
    /** The printed resolution, where the numbers look printed. */
    roundingDecimals: number | null;
    roundingSigma: number | null;
    consistentWithRounding: boolean;
    /** Without a noise statement: the smallest σ that would explain the violation. */
    explainingSigma: number | null;
    /** Every physical state maps to a physical state. */
    stokesCondition: boolean;
    /** Not negative where it does. */
    stokesMargin: number | null;
    /** For absolute matrices. */
    passivity: { margin: Figure; verdict: "passive" | "notBeyondNoise" | "notPassive" } | null;
}

export interface PolarDecomposition {
    depolarizer: Matrix16 | null;
    retarder: Matrix16 | null;
    diattenuator: Matrix16;
    /** The fast eigenstate on the Poincaré sphere. */
    retarderAxis: number[] | null;
    residual: number | null;
    reason: string | null;
}

/** `[re, im]` of the four entries, row by row. */
export type JonesMatrix = [number, number][];

/**
 * The principal logarithm of the normalised matrix in two parts. Birefringences are
 * differences of phase in radians, dichroisms half of the logarithm of a ratio of
 * transmittances: pure numbers, accumulated along the path. In every convention a
 * positive one means that light along the zero of angles, at +45°, or of positive S3
 * is fast, or more transmitted. All are null where there is no logarithm.
 */
export interface DifferentialDecomposition {
    mean: Matrix16 | null;
    depolarizing: Matrix16 | null;
    linearBirefringence: number | null;
    linearBirefringence45: number | null;
    circularBirefringence: number | null;
    linearDichroism: number | null;
    linearDichroism45: number | null;
    circularDichroism: number | null;
    reason: string | null;
}

export interface Examination {
    realizability: Realizability;
    nearest: {
        mueller: Matrix16 | null;
        change: Matrix16 | null;
        changeInSigma: Matrix16 | null;
        reason: string | null;
    };
    figures: Record<FigureName, Figure>;
    decompositions: {
        /** The depolarizer is last. */
        polarForward: PolarDecomposition | null;
        /** The depolarizer is first. */
        polarReverse: PolarDecomposition | null;
        /** Of the measured matrix. */
        differential: DifferentialDecomposition | null;
        /** Of the nearest realizable matrix; empty where M00 is not positive. */
        spectral: { weight: number; jones: JonesMatrix; mueller: Matrix16 }[];
        /**
         * Of the nearest realizable matrix: a pure part, equal mixtures of two and of
         * three, and an ideal depolarizer. Empty where M00 is not positive.
         */
        characteristic: { weight: number; mueller: Matrix16 }[];
        isotropic: {
            alpha: Figure;
            jones: JonesMatrix | null;
            mueller: Matrix16;
            chiSquare: number | null;
            degreesOfFreedom: number;
            pValue: number | null;
            reason: string | null;
        } | null;
        reason: string | null;
    };
}

/** What may have gone wrong, the likeliest first. */
export interface Diagnosis {
    /** The smallest σ of equal errors that would explain the violation. */
    explainingSigma: number | null;
    /** False where no check could see that one side is counted the other way round, as with a polarizer. */
    mirrorVisible: boolean;
    causes: {
        cause: "mirror-one-side" | "m00-too-small" | "one-element" | "row-gain" | "column-gain" | "overall-sign";
        /** Of the violation that is left without it. */
        pValue: number;
        /** Slips with the same effect on the eigenvalues; which one it was, no check can tell. */
        candidates: string[] | null;
        /** What is missing in M00. */
        delta: number | null;
        /** Row and column, from 0. */
        element: [number, number] | null;
        /** Row or column, from 0. */
        line: number | null;
        /** What the row or column is to be multiplied by. */
        factor: number | null;
        /** The matrix without it, row by row. */
        mueller: Matrix16;
    }[];
}

export interface DetectRequest {
    /** σ over M00. */
    sigma: number;
    /** Whether M00 has no error. */
    normalised?: boolean;
}

/** What a noise can show, before anything is measured; all relative to M00. */
export interface Detectable {
    /** Standard error of the isotropic depolarization α, and what differs from 0 at 95 %. */
    alphaSe: number;
    alpha: number;
    /** A diattenuation or polarizance that stands out of the noise 95 times in 100. */
    diattenuation: number;
    /** Standard errors by which a retarder with one side mirrored lies beyond realizability. */
    mirrorMargin: number;
}

export interface CompareRequest {
    first: Measurement;
    second: Measurement;
}

/** The second minus the first, in the convention of the first. */
export interface Comparison {
    difference: Matrix16;
    differenceInSigma: Matrix16 | null;
    chiSquare: number | null;
    degreesOfFreedom: number;
    pValue: number | null;
    figures: { name: FigureName; value: number | null; se: number | null; unit: Figure["unit"] }[];
    reason: string | null;
}

/** In order of parameters. */
export type ModelName =
    | "linearRetarder"
    | "linearDiattenuator"
    | "alignedDiattenuatingRetarder"
    | "ellipticalRetarder"
    | "ellipticalDiattenuator"
    | "pure"
    | "pureIsotropic"
    | "pureLinearCircular"
    | "pureDiagonal"
    | "rankTwo"
    | "rankThree"
    | "rankFour";

/** Where the depolarization stands: beside the element, behind it or in front of it. */
export type DepolarizationSide = "parallel" | "after" | "before";

export interface FitRequest {
    target: Measurement;
    /** Default all of them. */
    models?: ModelName[];
    /** Default "parallel"; for the models with several depolarizations "after". */
    side?: DepolarizationSide;
    seed?: number;
}

export interface FitParameter {
    name: string;
    value: number;
    /** First order; null where nothing determines it. */
    se: number | null;
    /** 95 %. */
    low: number | null;
    high: number | null;
    /** "root" is the root of the unit of the matrix. */
    unit: "1" | "deg" | "matrix" | "root";
    /** Held at the end of its range. */
    atBound: boolean;
}

export interface ModelFit {
    model: ModelName;
    side: DepolarizationSide | null;
    parameterCount: number;
    parameters: FitParameter[];
    /** What follows from a Jones matrix. */
    derived: FitParameter[];
    /** Of the parameters; empty for mixtures. */
    covariance: number[][];
    correlation: (number | null)[][];
    /** Parameters that can be moved together without any effect. */
    nullDirections: string[][];
    /** Other numbers for the same element. */
    equivalents: { name: string; value: number }[][];
    /** Of the element without its depolarization. */
    jones: JonesMatrix | null;
    /** Null without noise. */
    chiSquare: number | null;
    degreesOfFreedom: number;
    pValue: number | null;
    /** For a p by simulation: how many. */
    simulations: number;
    aic: number | null;
    bic: number | null;
    mueller: Matrix16;
    /** Measured less fitted in σ; in units of `rms` without noise. */
    residuals: Matrix16;
    /** In the unit of the matrix. */
    rms: number;
    /** Judged by the gradient. */
    stop: "minimum" | "stalled" | "patience";
    gradientCosine: number;
    evaluations: number;
    /** What it should be read with. */
    remarks: string[];
}

export interface Fits {
    fits: ModelFit[];
    recommended: { model: ModelName; rule: "p-value" | "criterion"; sentence: string } | null;
}

export interface RecipeRequest extends Omit<FitRequest, "models"> {
    model: ModelName;
}

export interface ProfileRequest extends Omit<FitRequest, "models"> {
    model: ModelName;
    /** The name of a parameter of the fit, or of what follows from it. */
    parameter: string;
}

export interface Profile {
    values: number[];
    /** χ² less its minimum. */
    rises: number[];
    /** Where it has risen by 3.84; null where it does not. */
    low: number | null;
    high: number | null;
    unit: FitParameter["unit"];
}

export interface BootstrapRequest extends Omit<FitRequest, "models"> {
    model: ModelName;
    /** Slices join to the same numbers however they are cut. */
    first?: number;
    count?: number;
}

export interface BootstrapSamples {
    samples: { name: string; unit: FitParameter["unit"]; values: (number | null)[] }[];
    chiSquare: number[];
}

export type ElementKind =
    | "linearDiattenuator"
    | "linearRetarder"
    | "circularRetarder"
    | "ellipticalRetarder"
    | "ellipticalDiattenuator"
    | "alignedDiattenuatingRetarder"
    | "rotator"
    | "isotropicReflector"
    | "fresnelReflection"
    | "fresnelTransmission"
    | "isotropicDepolarizer"
    | "diagonalDepolarizer"
    | "measured";

/** Fixed unless it is free or tied. */
export interface TrainParameter {
    /** Also the start of a free one; needed unless it is tied. */
    value?: number;
    free?: boolean;
    /** Bounds of a free one. */
    low?: number | null;
    high?: number | null;
    /** It is `factor` times the other one plus `offset`, both as they are written here. */
    tie?: {
        /** Position in the train, from 0. */
        element: number;
        name: string;
        /** Default 1. */
        factor?: number;
        /** Default 0. */
        offset?: number;
    } | null;
}

/** An element of a train; light meets the elements in list order. */
export interface TrainElement {
    kind: ElementKind;
    label?: string;
    /** Out of the beam. */
    disabled?: boolean;
    /** By the names of the kind; all of them. */
    parameters?: Record<string, TrainParameter>;
    /** Of a measured one, in place of parameters. */
    measurement?: Measurement;
}

export interface FollowRequest {
    /** In the convention of the request; may be partly polarized. */
    source: [number, number, number, number];
    train: TrainElement[];
    /** Of source, parameters and result; a measured element has its own. */
    convention?: Convention;
}

export interface Followed {
    /** After every element, disabled ones too. */
    states: (StateDescription & {
        /** S0 over that of the source. */
        power: number;
    })[];
    /** Of the whole. */
    mueller: Matrix16;
    /** Where light is lost, where it depolarizes, where the order of neighbours matters. */
    notes: Note[];
}

export interface RemoveRequest {
    measured: Measurement;
    /** What light meets before the sample: a measurement, or a train in the convention of `measured`. Default: nothing. */
    pre?: Measurement | TrainElement[] | null;
    /** What it meets after the sample. */
    post?: Measurement | TrainElement[] | null;
    /** Take diag(1, 1, -1, -1) out too. */
    reflection?: boolean;
    /** The matrix of a component that does not depolarize, such as that of air: how much of it is in the sample? */
    direct?: Matrix16 | null;
}

export interface RemovedOptics {
    /** The sample alone, divided by its M00 where that of the measurement is exact. */
    mueller: Matrix16;
    /** 16 × 16, row by row; null without any noise. */
    covariance: number[] | null;
    normalised: boolean;
    /** The worst growth of a relative error. */
    conditionNumber: number;
    /** σ over M00 of each element of the sample, over that of the measurement; for equal errors where none are stated. */
    sigmaGrowth: Matrix16 | null;
    /** Samples within the physical that explain the measurement best with the optics as they are. */
    samples: {
        model: "realizable" | "pureIsotropic";
        mueller: Matrix16;
        chiSquare: number | null;
        degreesOfFreedom: number | null;
        pValue: number | null;
        /** Isotropic depolarization of a pure sample. */
        alpha: number | null;
        alphaSe: number | null;
        /** From the matrix above, over its M00. */
        distance: number;
    }[];
    /** The largest share of M00 that the direct component can have. */
    direct: { weight: number; se: number | null; rank: number; reason: string | null } | null;
    reason: string | null;
}

export interface FitTrainRequest {
    target: Measurement;
    /** In the convention of the target. */
    train: TrainElement[];
    /** Of the starting points. Default 1. */
    seed?: number;
    /** How many searches, the first from the values of the train. */
    starts?: number;
}

/** The free parameters of a train, fitted to a measured matrix. */
export interface TrainFit {
    parameters: {
        /** Position of the element. */
        element: number;
        name: string;
        /** Parameter and element in words. */
        title: string;
        value: number;
        /** Null, with a reason, where it is not determined. */
        se: number | null;
        /** Of the 95 % interval. */
        low: number | null;
        high: number | null;
        unit: "1" | "deg";
        atBound: boolean;
        reason: string | null;
    }[];
    /** Null in rows and columns of parameters without standard error. */
    covariance: (number | null)[][];
    correlation: (number | null)[][];
    /** What can't be told apart. */
    nullDirections: {
        /** Positions in `parameters`. */
        parameters: number[];
        /** How these can change together. */
        directions: number[][];
        /** The matrix changes, but by less than its noise. */
        withinNoise: boolean;
        sentence: string;
    }[];
    /** Other solutions that are as good, values in the order of `parameters`. */
    equivalents: { values: number[]; chiSquareDifference: number; sentence: string }[];
    chiSquare: number | null;
    degreesOfFreedom: number;
    pValue: number | null;
    aic: number | null;
    bic: number | null;
    mueller: Matrix16;
    /** Measured minus fitted in σ, row by row. */
    residuals: Matrix16 | null;
    stop: "gradient" | "step" | "decrease" | "steps";
    evaluations: number;
}

export interface SymmetryTest {
    symmetry: "reciprocalSameFrame" | "reciprocalMirrored" | "noCircularPart" | "blockDiagonal";
    /** The largest violation, over M00. */
    deviation: number | null;
    chiSquare: number | null;
    degreesOfFreedom: number;
    pValue: number | null;
    reason: string | null;
}

export interface FormatRequest {
    value: number;
    se?: number | null;
}

export interface FormattedValue {
    /** For reading, with U+2212 as the minus. */
    text: string;
    /** The same in ASCII. */
    plain: string;
}

export interface EngineInfo {
    version: string;
    /** Of the configuration: its `v`. */
    schema: number;
    /** The blocks of a configuration that this version understands. */
    blocks: string[];
}

/** A session, as a link holds it. Blocks that this version does not know are kept. */
/** A table for other programs; all columns have as many values. */
export interface ExportTable {
    name: string;
    columns: { name: string; unit?: string; values: (number | string | null)[] }[];
}

/** What is to be written; at least one matrix or table. */
export interface ExportRequest {
    form: "tsv" | "csv" | "csvEuropean" | "json" | "latex" | "python" | "matlab";
    title?: string;
    notes?: string[];
    matrices?: { name: string; unit?: string; mueller: number[]; sigma?: number[] | null }[];
    tables?: ExportTable[];
}

export interface Configuration {
    v: number;
    app?: string;
    task?: string;
    label?: string;
    measurement?: Omit<Measurement, "mueller"> & {
        mueller: Matrix16 | null;
        text?: string;
        example?: boolean;
    };
    /** The other one of a pair. */
    compareWith?: Omit<Measurement, "mueller"> & { mueller: Matrix16 | null };
    /** Several matrices and what they are to each other; left out where the text holds them. */
    series?: {
        use: "ask" | "pick" | "series" | "repeats" | "pair";
        matrices?: Matrix16[];
        labels?: string[];
        coordinates?: number[];
    };
    /** The file that the matrices came from. */
    dataFile?: { name: string; sha256: string };
    examine?: { draws: number; seed: number };
    /** The model that was chosen by hand, and where its depolarization stands. */
    fit?: { model?: ModelName; side?: DepolarizationSide };
    /** A train, its source, and what stands before and behind the sample; a train that is written may lack values. */
    train?: TrainElement[];
    source?: [number, number, number, number];
    pre?: Measurement | TrainElement[];
    post?: Measurement | TrainElement[];
    /** How known optics are taken away. */
    removal?: { reflection?: boolean; direct?: Matrix16 };
    view?: Record<string, number>;
    [block: string]: unknown;
}

/** Size and colours of a plot. */
export interface Frame {
    /** CSS pixels. */
    width: number;
    /** CSS pixels; left out, the plot's own height for that width. */
    height?: number;
    /** Device pixels in a CSS pixel; matters on a canvas only. Default 1. */
    ratio?: number;
    theme?: "light" | "dark" | "print";
    /** Red, green and blue, 0 to 255, in place of the theme's: the system's, where it forces its colours. */
    colours?: Partial<Record<"background" | "panel" | "ink" | "mute" | "line" | "accent" | "hatch", [number, number, number]>>;
}

export interface MapStatesRequest {
    mueller: Matrix16;
    convention?: Convention;
}

/** A state in the person's convention. */
export interface StateDescription {
    stokes: [number, number, number, number];
    /** Of polarization; null where there is no light. */
    degree: number | null;
    azimuthDeg: number | null;
    ellipticityDeg: number | null;
}

export interface MappedState {
    label: string;
    input: StateDescription;
    output: StateDescription;
}

export interface EigenvaluesRequest {
    eigenvalues: number[];
    eigenvalueSe?: number[] | null;
    frame: Frame;
}

export interface SphereRequest {
    mueller: Matrix16;
    convention?: Convention;
    /** Longitude of the point that faces the viewer, from S1 towards S2. */
    azimuthDeg: number;
    elevationDeg: number;
    /** The label of the state whose marks are ringed. */
    chosen?: string | null;
    /** States that light goes through, S1, S2 and S3 over S0: drawn in place of what the matrix does. */
    path?: [number, number, number][];
    frame: Frame;
}

/** Where a standard state's marks are on the sphere's picture, CSS pixels from the upper left corner. */
export interface SphereMark {
    label: string;
    input: [number, number];
    /** null where no light comes out. */
    output: [number, number] | null;
}

export interface EllipsesRequest {
    mueller: Matrix16;
    convention?: Convention;
    frame: Frame;
}

/** Curves over one axis; at most eight. */
export interface CurvesRequest {
    /** Of the picture as a file. */
    title?: string;
    /** What stands along and upwards, each with its unit. */
    along: string;
    upwards: string;
    /** The first is drawn in colour and whole, the others in dashes; `dots` is for what was measured. */
    curves: { name?: string; x: number[]; y: number[]; dots?: boolean }[];
    /** Lines across the whole frame. */
    levels?: { name?: string; value: number }[];
    /** Lines at places along the axis. */
    places?: { name?: string; value: number }[];
    frame: Frame;
}

export interface Drawn {
    /** What the plot shows, in words, with its numbers. */
    description: string;
    /** CSS pixels. */
    width: number;
    /** CSS pixels. */
    height: number;
}

/** What a person may settle about a text; what is left out is found out. */
export interface ReadOptions {
    decimal?: "point" | "comma";
    /** Means nothing in bracketed forms. */
    delimiter?: "tab" | "semicolon" | "comma" | "space";
    /** Which axes of a saved array count the matrices; means nothing elsewhere. */
    stacking?: "first" | "last";
}

/** Where something is wrong: a field of the request, or a spot of a text, counted from one. */
export type Place = { field: string } | { line: number; character: number; length: number };

export interface Note {
    severity: "information" | "warning" | "refusal";
    code: string;
    message: string;
    at: Place | null;
}

export interface MatrixRead {
    /** In the order of the text. */
    mueller: Matrix16;
    /** The uncertainties printed with the numbers, one standard deviation each. */
    sigma: Matrix16 | null;
    /** Where in a series it belongs: a column before the sixteen, or a title such as "450 nm". */
    coordinate: number | null;
    /** From a comment, a name or a row label beside it. */
    label: string | null;
    /** Where it begins, counted from one. */
    line: number;
    /** The printed resolution is 10^-decimals. */
    decimals: number | null;
}

export interface Reading {
    form: "table" | "brackets" | "bracketsWithSemicolons" | "binary";
    decimalChar: "." | ",";
    /** The mark of thousands that was dropped. */
    groupChar: "," | "." | null;
    delimiter: "tab" | "semicolon" | "comma" | "space" | null;
    /** Which axes counted the matrices; null but in saved arrays. */
    stacking: "first" | "last" | null;
    order: "rows";
    headerRowCount: number;
    count: number;
}

export interface MatricesRead {
    /** At least one. */
    matrices: MatrixRead[];
    reading: Reading;
    /** Other readings with other numbers: then the person must choose. */
    alternatives: { reading: Reading; matrices: MatrixRead[] }[];
    notes: Note[];
}

/** Every failure is thrown as one of these. */
export interface HalfshadeError extends Error {
    /** Stable. */
    code: string;
    at: Place | null;
}
