using Stacks.Abstractions;
using Stacks.Formats.Fits.Tiles;

namespace Stacks.Formats.Fits;

/// <summary>Numbers the science planes of a file and refuses, by name, what cannot be read.</summary>
internal static class FrameIndex
{
    /// <summary>The HDUs with layouts, frame numbers and masks.</summary>
    /// <exception cref="StackFormatException">No science frame, truncated, or of a kind that is refused.</exception>
    public static IReadOnlyList<Hdu> Build(FitsReader reader, List<Hdu> hdus, ReadOptions options)
    {
        long frames = 0;
        for (int i = 0; i < hdus.Count; i++)
        {
            Hdu hdu = hdus[i];
            if (hdu.Role is HduRole.Science or HduRole.QualityMask)
                hdus[i] = hdu = hdu with { Layout = ImageLayout.Read(hdu, reader.ReadHeader(hdu)) };
            if (hdu.Layout is not null && hdu.Kind == HduKind.CompressedImage)
                hdus[i] = hdu = hdu with { Tiles = TiledImage.Read(hdu, reader.ReadStoredHeader(hdu)) };
            if (hdu.Tiles is not null && hdu.IsTruncated)
                hdus[i] = hdu = hdu with { WholePlanes = TileRows.WholePlanes(reader.File, hdu) };
            if (hdu.Role == HduRole.Science)
            {
                hdus[i] = hdu = hdu with { FirstFrame = (int)frames };
                frames += hdu.Planes;
            }

            if (hdu.IsTruncated && !options.AllowTruncated)
                throw Truncation.Fault(hdu, frames);
            if (frames > int.MaxValue)
                throw new StackFormatException(hdu.Where, $"{frames} frames are more than 2^31", "cut the stack into shorter ones");
        }

        if (reader.HeaderIsTruncated && !options.AllowTruncated)
            throw Truncation.HeaderFault(reader, hdus.Count);
        if (frames == 0)
            throw NoFrames(reader.Path, hdus);

        for (int i = 0; i < hdus.Count; i++)
        {
            if (hdus[i].Role == HduRole.Science)
                hdus[i] = hdus[i] with { Masks = HduRoles.MasksOf(hdus[i], hdus) };
        }

        return hdus;
    }

    private static StackFormatException NoFrames(string path, List<Hdu> hdus)
    {
        const string remedy = "name a file, or extensions, with an image of two or more axes";
        Hdu? groups = hdus.FirstOrDefault(h => h.Kind == HduKind.RandomGroups);
        Hdu? line = hdus.FirstOrDefault(h => h.IsImage && h.Axes.Count == 1);
        Hdu? cut = hdus.FirstOrDefault(h => h.Role == HduRole.Science);
        if (groups is not null)
            return new StackFormatException(groups.Where, "random groups (GROUPS = T) are visibilities, not frames, and no image follows", remedy);
        if (line is not null)
            return new StackFormatException(line.Where, "an array of one axis (NAXIS = 1) is no image", remedy);
        if (cut is not null)
            return new StackFormatException(cut.Where, "the file ends before the end of its first frame", "copy the file again from where it was made");
        return new StackFormatException(path, $"no science frame; there are: {string.Join("; ", hdus.Select(h => $"{h.Label} ({PartList.KindName(h)})"))}", remedy);
    }
}
