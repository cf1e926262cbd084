namespace Stacks.Formats.Tiff;

/// <summary>Tag numbers that mean something to this plugin (TIFF 6.0; technical note 3 for predictor 3; TIFF/EP for the mosaic).</summary>
internal static class Tag
{
    public const ushort NewSubfileType = 254;
    public const ushort SubfileType = 255;
    public const ushort ImageWidth = 256;
    public const ushort ImageLength = 257;
    public const ushort BitsPerSample = 258;
    public const ushort Compression = 259;
    public const ushort Photometric = 262;
    public const ushort FillOrder = 266;
    public const ushort ImageDescription = 270;
    public const ushort Make = 271;
    public const ushort Model = 272;
    public const ushort StripOffsets = 273;
    public const ushort SamplesPerPixel = 277;
    public const ushort RowsPerStrip = 278;
    public const ushort StripByteCounts = 279;
    public const ushort MinSampleValue = 280;
    public const ushort MaxSampleValue = 281;
    public const ushort XResolution = 282;
    public const ushort YResolution = 283;
    public const ushort PlanarConfiguration = 284;
    public const ushort FreeOffsets = 288;
    public const ushort FreeByteCounts = 289;
    public const ushort GrayResponseUnit = 290;
    public const ushort GrayResponseCurve = 291;
    public const ushort ResolutionUnit = 296;
    public const ushort TransferFunction = 301;
    public const ushort Software = 305;
    public const ushort DateTime = 306;
    public const ushort Predictor = 317;
    public const ushort ColorMap = 320;
    public const ushort TileWidth = 322;
    public const ushort TileLength = 323;
    public const ushort TileOffsets = 324;
    public const ushort TileByteCounts = 325;
    public const ushort SubIfds = 330;
    public const ushort ExtraSamples = 338;
    public const ushort SampleFormat = 339;
    public const ushort SMinSampleValue = 340;
    public const ushort SMaxSampleValue = 341;
    public const ushort JpegTables = 347;
    public const ushort OldJpegFirst = 512;
    public const ushort OldJpegLast = 521;
    public const ushort Xmp = 700;
    public const ushort CfaRepeatPatternDim = 33421;
    public const ushort CfaPattern = 33422;
    public const ushort ExifDirectory = 34665;
    public const ushort GpsDirectory = 34853;
    public const ushort InteroperabilityDirectory = 40965;
}
